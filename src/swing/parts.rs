//! Divides the circuit into parts that share nothing but nodes which sources hold, so that each is stepped at its own
//! pace.

use super::inputs::{Given, listens_to};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use petgraph::unionfind::UnionFind;

/// One part.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct PartList {
    /// Its elements, in order.
    pub elements: Vec<ElementId>,
    /// Its nodes, in order; those that sources hold belong to none.
    pub nodes: Vec<NodeId>,
}

/// All parts, in the order of their first elements.
pub(super) fn parts(circuit: &Circuit, given: &Given<'_>) -> Vec<PartList> {
    let nodes = circuit.nodes.len().max(1);
    let mut sets = UnionFind::<u32>::new(nodes + circuit.elements.len());
    let of_element = |id: ElementId| (nodes + id.index()) as u32;
    for (id, element) in circuit.elements() {
        for node in touched(circuit, id) {
            if given.held[node.index()].is_none() {
                sets.union(of_element(id), node.0);
            }
        }
        if let Some(other) = listens_to(&element.behaviour) {
            sets.union(of_element(id), of_element(other));
        }
        if let Behaviour::Coupling { coils, .. } = &element.behaviour {
            for &coil in coils {
                sets.union(of_element(id), of_element(coil));
            }
        }
    }
    let mut number: Vec<Option<usize>> = vec![None; nodes + circuit.elements.len()];
    let mut parts: Vec<PartList> = Vec::new();
    for (id, element) in circuit.elements() {
        let is_outside = given.is_boundary[id.index()];
        let is_free = touched(circuit, id).any(|n| given.held[n.index()].is_none());
        if is_outside || !(is_free || matters_alone(&element.behaviour)) {
            continue;
        }
        let root = sets.find_mut(of_element(id)) as usize;
        let at = *number[root].get_or_insert(parts.len());
        if at == parts.len() {
            parts.push(PartList::default());
        }
        parts[at].elements.push(id);
    }
    for node in (1..nodes).filter(|&n| given.held[n].is_none()) {
        if let Some(at) = number[sets.find_mut(node as u32) as usize] {
            parts[at].nodes.push(NodeId::new(node));
        }
    }
    parts
}

/// Between nodes that are held, only these show anything.
fn matters_alone(behaviour: &Behaviour) -> bool {
    matches!(behaviour, Behaviour::Diode { .. } | Behaviour::Inductor { .. } | Behaviour::Coupling { .. })
        || listens_to(behaviour).is_some()
        || matches!(behaviour, Behaviour::VoltageByVoltage { .. } | Behaviour::VoltageSource(_))
}

/// Nodes through which an element takes part; what a switch listens to is given from outside.
fn touched(circuit: &Circuit, id: ElementId) -> impl Iterator<Item = NodeId> + '_ {
    let count = match circuit.element(id).behaviour {
        Behaviour::VoltageSwitch { .. } => 2,
        _ => usize::MAX,
    };
    circuit.pins(id).iter().take(count).map(|p| p.node)
}
