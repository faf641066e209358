//! Nodes grouped by what joins them: islands, related islands, and groups held by direct-current paths.

use super::links::{Link, is_opaque, links};
use super::noted::Noted;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use petgraph::unionfind::UnionFind;

/// A partition of the nodes. Group 0 is that of ground; the others are numbered in the order of their first
/// node.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Groups {
    of: Vec<u32>,
    count: usize,
}

impl Groups {
    /// The group of a node.
    pub fn of(&self, node: NodeId) -> usize {
        self.of.get(node.index()).map_or(0, |&g| g as usize)
    }

    /// Number of groups.
    pub fn count(&self) -> usize {
        self.count
    }

    /// The nodes of every group but that of ground, in order; made anew at each call.
    pub fn members(&self) -> Vec<Vec<NodeId>> {
        let mut members = vec![Vec::new(); self.count];
        for (n, &group) in self.of.iter().enumerate() {
            if group != 0 {
                members[group as usize].push(NodeId::new(n));
            }
        }
        members
    }

    pub(super) fn from(sets: UnionFind<u32>) -> Self {
        let labels = sets.into_labeling();
        let mut number = vec![u32::MAX; labels.len()];
        let mut count = 0;
        let mut of = Vec::with_capacity(labels.len());
        for &label in &labels {
            let slot = &mut number[label as usize];
            if *slot == u32::MAX {
                *slot = count;
                count += 1;
            }
            of.push(*slot);
        }
        Groups { of, count: count as usize }
    }
}

/// Joins two pins of an element.
pub(super) fn join(circuit: &Circuit, sets: &mut UnionFind<u32>, id: ElementId, a: usize, b: usize) {
    sets.union(circuit.node(id, a).0, circuit.node(id, b).0);
}

/// Joins what the links that `wanted` picks join; unknown elements and supplied nodes are joined to ground.
pub(super) fn by_links(
    circuit: &Circuit,
    noted: &Noted,
    wanted: impl Fn(ElementId, Link) -> bool,
) -> UnionFind<u32> {
    let mut sets = UnionFind::new(circuit.nodes.len());
    for (id, _) in circuit.elements() {
        for (a, b, link) in links(circuit, id) {
            if wanted(id, link) {
                join(circuit, &mut sets, id, a, b);
            }
        }
        if is_opaque(circuit, id) && !circuit.pins(id).is_empty() {
            sets.union(circuit.node(id, 0).0, NodeId::GROUND.0);
        }
    }
    for node in &noted.supplied {
        sets.union(node.0, NodeId::GROUND.0);
    }
    sets
}

pub(super) fn islands(circuit: &Circuit, noted: &Noted) -> Groups {
    Groups::from(by_links(circuit, noted, |_, _| true))
}

pub(super) fn held(circuit: &Circuit, noted: &Noted) -> Groups {
    let mut sets = by_links(circuit, noted, |_, link| link == Link::Direct);
    for &(node, _) in &circuit.initial {
        // an initial voltage tells what the rest leaves open
        sets.union(node.0, NodeId::GROUND.0);
    }
    for (id, element) in circuit.elements() {
        if let Behaviour::Capacitor { initial: Some(_), .. } = element.behaviour {
            join(circuit, &mut sets, id, 0, 1);
        }
    }
    Groups::from(sets)
}

pub(super) fn related(circuit: &Circuit, noted: &Noted) -> Groups {
    let mut sets = by_links(circuit, noted, |_, _| true);
    for (id, element) in circuit.elements() {
        // sensing inputs
        for pin in 2..circuit.pins(id).len() {
            join(circuit, &mut sets, id, 0, pin);
        }
        let mut relate = |other: ElementId| sets.union(circuit.node(id, 0).0, circuit.node(other, 0).0);
        match &element.behaviour {
            Behaviour::VoltageByCurrent { control: Some(control), .. }
            | Behaviour::CurrentByCurrent { control: Some(control), .. }
            | Behaviour::CurrentSwitch { control: Some(control), .. } => {
                relate(*control);
            }
            Behaviour::Coupling { coils, .. } => {
                for pair in coils.windows(2) {
                    sets.union(circuit.node(pair[0], 0).0, circuit.node(pair[1], 0).0);
                }
            }
            _ => {}
        }
    }
    Groups::from(sets)
}
