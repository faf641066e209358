//! Ends of what drives alternating current: of moving sources, of sources that float, of coupled windings, each
//! followed outwards through what lies in series with it. Between them bridges and centre-tapped rectifiers are built.

use super::cuts::coupled_coils;
use super::rails::Rails;
use super::touching::Touching;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use petgraph::unionfind::UnionFind;
use std::collections::{BTreeMap, BTreeSet};

/// Ends that hang together, in order.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Driven {
    /// The ends; ground among them where one is.
    pub ends: Vec<NodeId>,
    /// What drives them, in order.
    pub by: Vec<ElementId>,
}

/// All groups of two and more ends.
pub(super) fn driven(circuit: &Circuit, touching: &Touching, rails: &Rails) -> Vec<Driven> {
    let coils = coupled_coils(circuit);
    let floats = |id: ElementId| !rails.is_rail(circuit.node(id, 0)) && !rails.is_rail(circuit.node(id, 1));
    let drives = |id: ElementId| match &circuit.element(id).behaviour {
        Behaviour::VoltageSource(source) => source.shape.is_some() || source.ac.is_some() || floats(id),
        Behaviour::Inductor { .. } => coils.contains(&id),
        _ => false,
    };
    let drivers: Vec<ElementId> = circuit.elements().map(|(id, _)| id).filter(|&id| drives(id)).collect();
    let mut sets = UnionFind::<u32>::new(circuit.nodes.len().max(1));
    let mut ends: Vec<(NodeId, ElementId)> = Vec::new();
    for &id in &drivers {
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        sets.union(a.0, b.0);
        for node in [a, b] {
            let end = outwards(circuit, touching, node, id);
            sets.union(node.0, end.0);
            ends.push((end, id));
        }
    }
    let mut groups: BTreeMap<u32, (BTreeSet<NodeId>, BTreeSet<ElementId>)> = BTreeMap::new();
    for (end, id) in ends {
        let group = groups.entry(sets.find(end.0)).or_default();
        group.0.insert(end);
        group.1.insert(id);
    }
    groups
        .into_values()
        .filter(|(ends, _)| ends.len() > 1)
        .map(|(ends, by)| Driven { ends: ends.into_iter().collect(), by: by.into_iter().collect() })
        .collect()
}

/// Follows resistors, inductors and capacitors as long as nothing else touches the node between them.
fn outwards(circuit: &Circuit, touching: &Touching, from: NodeId, by: ElementId) -> NodeId {
    let (mut node, mut came_by) = (from, by);
    for _ in 0..8 {
        if node == NodeId::GROUND {
            break;
        }
        let mut others = touching.carrying(circuit, node).filter(|t| t.element != came_by);
        let (Some(next), None) = (others.next(), others.next()) else { break };
        let passes = matches!(
            circuit.element(next.element).behaviour,
            Behaviour::Resistor(_) | Behaviour::Inductor { .. } | Behaviour::Capacitor { .. }
        );
        if !passes {
            break;
        }
        let far = circuit.node(next.element, 1 - next.pin.min(1) as usize);
        if far == NodeId::GROUND {
            break;
        }
        came_by = next.element;
        node = far;
    }
    node
}
