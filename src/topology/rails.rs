//! Nodes that voltage sources hold against ground, along chains of sources: rails. What they are worth in a condition is
//! summed along the chain; the values themselves are the caller's.

use super::adjacent::Adjacent;
use super::noted::Noted;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};

/// How a rail hangs on the next node towards ground.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Hold {
    /// A source or 0 Ω; counted from its first pin to its second, or the other way.
    Element { id: ElementId, forward: bool, from: NodeId },
    /// A `supply` note.
    Supply,
    /// The output of a controlled source: held, but at a voltage that is not known here.
    Driven,
}

/// What holds voltages, by node.
struct Around<'a> {
    circuit: &'a Circuit,
    sources: &'a [ElementId],
    around: &'a Adjacent,
}

/// All rails. Ground is one.
#[derive(Debug, Clone, Default)]
pub struct Rails {
    holds: Vec<Option<Hold>>,
    /// Rails in an order in which each hangs on an earlier one.
    order: Vec<NodeId>,
}

impl Rails {
    pub(super) fn of(circuit: &Circuit, noted: &Noted) -> Self {
        let count = circuit.nodes.len().max(1);
        let (mut sources, mut driven) = (Vec::new(), Vec::new());
        for (id, element) in circuit.elements() {
            let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
            match &element.behaviour {
                Behaviour::VoltageSource(_) => {}
                Behaviour::Resistor(ohms) if ohms.number == 0.0 => {}
                Behaviour::VoltageByVoltage { .. } | Behaviour::VoltageByCurrent { .. } => {
                    driven.push((a, b));
                    continue;
                }
                _ => continue,
            }
            sources.push(id);
        }
        let ends = |&id: &ElementId| (circuit.node(id, 0).0, circuit.node(id, 1).0);
        let around = Adjacent::of(count, sources.iter().map(ends));
        let around = Around { circuit, sources: &sources, around: &around };
        let mut rails = Rails { holds: vec![None; count], order: Vec::new() };
        rails.holds[0] = Some(Hold::Supply);
        let mut open = vec![NodeId::GROUND];
        for &node in &noted.supplied {
            rails.holds[node.index()] = Some(Hold::Supply);
            open.push(node);
        }
        rails.spread(&around, open);
        for (a, b) in driven {
            for (node, other) in [(a, b), (b, a)] {
                if rails.is_rail(other) && !rails.is_rail(node) {
                    rails.holds[node.index()] = Some(Hold::Driven);
                    rails.spread(&around, vec![node]);
                }
            }
        }
        rails
    }

    fn spread(&mut self, around: &Around<'_>, mut open: Vec<NodeId>) {
        while let Some(node) = open.pop() {
            self.order.push(node);
            for &(next, number) in around.around.of_node(node.index()) {
                if self.holds[next as usize].is_none() {
                    let id = around.sources[number as usize];
                    let forward = around.circuit.node(id, 0) == node;
                    self.holds[next as usize] = Some(Hold::Element { id, forward, from: node });
                    open.push(NodeId(next));
                }
            }
        }
    }

    /// The node's potential is held.
    pub fn is_rail(&self, node: NodeId) -> bool {
        self.holds.get(node.index()).is_some_and(Option::is_some)
    }

    /// The source next to the node on its way to ground; `None` for ground, supplies and what is not held.
    pub fn source(&self, node: NodeId) -> Option<ElementId> {
        match self.holds.get(node.index())? {
            Some(Hold::Element { id, .. }) => Some(*id),
            _ => None,
        }
    }

    /// Potential of each node that is held, in volts, given the values of sources and supplies.
    pub fn potentials(
        &self,
        source: impl Fn(ElementId) -> Option<f64>,
        supply: impl Fn(NodeId) -> Option<f64>,
    ) -> Vec<Option<f64>> {
        let mut volts = vec![None; self.holds.len()];
        for &node in &self.order {
            volts[node.index()] = match self.holds[node.index()] {
                _ if node == NodeId::GROUND => Some(0.0),
                Some(Hold::Supply) => supply(node),
                Some(Hold::Element { id, forward, from }) => {
                    let value = source(id).unwrap_or(0.0);
                    volts[from.index()].map(|at: f64| if forward { at - value } else { at + value })
                }
                Some(Hold::Driven) | None => None,
            };
        }
        volts
    }
}
