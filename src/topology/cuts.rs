//! Groups of nodes that no direct current can leave or enter but through current sources: what leads out of
//! them, and what the sources push in.

use super::decimal::{Sum, sum};
use super::groups::Groups;
use super::links::{Link, links};
use super::loops::dc_value;
use super::touching::Touching;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use rustc_hash::FxHashSet;

/// One such group. A group that makes up most of its island is none: the rest hangs on it.
#[derive(Debug, Clone, PartialEq)]
pub struct Cut {
    /// Its nodes, in order.
    pub nodes: Vec<NodeId>,
    /// The elements that touch it and pass no direct current: capacitors, current sources, gates, sensing
    /// inputs; in order.
    pub leads: Vec<ElementId>,
    /// The independent current sources among them that have one end outside, in order.
    pub sources: Vec<ElementId>,
    /// What these push into the group at the operating point, in amperes.
    pub inflow: Sum,
    /// One of them moves and has no DC value.
    pub moving: bool,
    /// A controlled current source drives it, so feedback may hold it.
    pub driven: bool,
    /// It holds a coupled coil or the output of a controlled voltage source: an isolated supply.
    pub isolated: bool,
}

/// All such groups.
pub(super) fn cuts(circuit: &Circuit, touching: &Touching, held: &Groups, islands: &Groups) -> Vec<Cut> {
    let members = held.members();
    let mut reference: Vec<usize> = vec![0; islands.count()];
    for (group, nodes) in members.iter().enumerate() {
        let Some(first) = nodes.first() else { continue };
        let best = &mut reference[islands.of(*first)];
        if islands.of(*first) != 0 && nodes.len() > members[*best].len() {
            *best = group;
        }
    }
    let coils = coupled_coils(circuit);
    let cut = |(group, nodes): (usize, Vec<NodeId>)| {
        let island = islands.of(*nodes.first()?);
        (reference[island] != group).then(|| describe(circuit, touching, held, &coils, group, nodes))
    };
    members.into_iter().enumerate().filter_map(cut).collect()
}

/// Coils that a coupling names.
pub fn coupled_coils(circuit: &Circuit) -> FxHashSet<ElementId> {
    let couplings = circuit.elements().filter_map(|(_, e)| match &e.behaviour {
        Behaviour::Coupling { coils, .. } => Some(coils.iter().copied()),
        _ => None,
    });
    couplings.flatten().collect()
}

fn describe(
    circuit: &Circuit,
    touching: &Touching,
    held: &Groups,
    coils: &FxHashSet<ElementId>,
    group: usize,
    nodes: Vec<NodeId>,
) -> Cut {
    let mut touches: Vec<ElementId> =
        nodes.iter().flat_map(|&n| touching.at(n)).map(|touch| touch.element).collect();
    touches.sort();
    touches.dedup();
    let mut cut = Cut {
        nodes,
        leads: Vec::new(),
        sources: Vec::new(),
        inflow: Sum::Zero,
        moving: false,
        driven: false,
        isolated: false,
    };
    let mut terms = Vec::new();
    for id in touches {
        let is_inside = |pin: usize| held.of(circuit.node(id, pin)) == group;
        let direct = links(circuit, id).any(|(a, _, link)| link == Link::Direct && is_inside(a));
        let crosses = is_inside(0) != is_inside(1);
        match &circuit.element(id).behaviour {
            Behaviour::CurrentSource(source) if crosses => {
                cut.sources.push(id);
                let (amperes, written) = dc_value(source);
                terms.push((if is_inside(1) { amperes } else { -amperes }, written));
                cut.moving |= source.dc.is_none() && source.shape.is_some();
            }
            Behaviour::CurrentByVoltage { .. } | Behaviour::CurrentByCurrent { .. } => cut.driven |= crosses,
            Behaviour::VoltageByVoltage { .. } | Behaviour::VoltageByCurrent { .. } => cut.isolated |= direct,
            _ => {}
        }
        cut.isolated |= coils.contains(&id);
        if !direct {
            cut.leads.push(id);
        }
    }
    cut.inflow = sum(terms);
    cut
}
