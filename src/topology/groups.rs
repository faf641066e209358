//! Nodes grouped by what joins them: islands, related islands, and groups held by direct-current paths.

use super::links::{Link, arcs, is_opaque, links};
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
fn join(circuit: &Circuit, sets: &mut UnionFind<u32>, id: ElementId, a: usize, b: usize) {
    sets.union(circuit.node(id, a).0, circuit.node(id, b).0);
}

/// Two nodes that a link joins.
#[derive(Debug, Clone, Copy)]
struct Joint {
    nodes: (NodeId, NodeId),
    link: Link,
    /// The link is a diode or a junction that passes current one way only.
    one_way: bool,
}

/// All links of a circuit, gone through once: each grouping of the nodes takes those it wants.
pub(super) struct Joints {
    count: usize,
    joints: Vec<Joint>,
    /// Nodes that what is not known, or a note, may join to ground.
    grounded: Vec<NodeId>,
    /// The most that the sources together can bring about, in volts.
    pub(super) available: f64,
}

impl Joints {
    pub(super) fn of(circuit: &Circuit, noted: &Noted, available: f64) -> Self {
        let mut joints = Vec::with_capacity(circuit.elements.len());
        let mut grounded = noted.supplied.clone();
        for (id, _) in circuit.elements() {
            let pins = circuit.pins(id);
            let arcs = arcs(circuit, id, available);
            for (a, b, link) in links(circuit, id) {
                // a substrate is no matter of direction
                let one_way = !arcs.is_empty() && a.max(b) < 3;
                joints.push(Joint { nodes: (pins[a].node, pins[b].node), link, one_way });
            }
            if is_opaque(circuit, id) {
                grounded.extend(pins.first().map(|pin| pin.node));
            }
        }
        Joints { count: circuit.nodes.len(), joints, grounded, available }
    }

    fn by(&self, wanted: impl Fn(&Joint) -> bool) -> UnionFind<u32> {
        let mut sets = UnionFind::new(self.count);
        for joint in self.joints.iter().filter(|joint| wanted(joint)) {
            sets.union(joint.nodes.0.0, joint.nodes.1.0);
        }
        for node in &self.grounded {
            sets.union(node.0, NodeId::GROUND.0);
        }
        sets
    }

    /// Nodes joined by what passes current both ways: any current, or a lasting one.
    pub(super) fn two_way(&self, steady: bool) -> Groups {
        let passes = |link: Link| !steady || link != Link::Capacitive;
        Groups::from(self.by(|joint| !joint.one_way && passes(joint.link)))
    }

    /// Islands; and those that are related, by couplings, sensing inputs and control currents as well.
    pub(super) fn islands_and_related(&self, circuit: &Circuit) -> (Groups, Groups) {
        let sets = self.by(|_| true);
        let mut related = sets.clone();
        relate(circuit, &mut related);
        (Groups::from(sets), Groups::from(related))
    }

    /// Nodes held by paths that pass a direct current.
    pub(super) fn held(&self, circuit: &Circuit) -> Groups {
        let mut sets = self.by(|joint| joint.link == Link::Direct);
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
}

fn relate(circuit: &Circuit, sets: &mut UnionFind<u32>) {
    for (id, element) in circuit.elements() {
        // sensing inputs
        for pin in 2..circuit.pins(id).len() {
            join(circuit, sets, id, 0, pin);
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
}
