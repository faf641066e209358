//! Which elements touch each node: one flat list, sorted by node, made by counting.

use super::links;
use crate::circuit::{Circuit, ElementId, NodeId};
use rustc_hash::FxHashSet;

/// One pin at a node.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Touch {
    /// The element.
    pub element: ElementId,
    /// Number of its pin, from 0.
    pub pin: u32,
}

/// All pins by node; within a node in the order of the text.
#[derive(Debug, Clone, Default)]
pub struct Touching {
    starts: Vec<u32>,
    touches: Vec<Touch>,
    /// Elements whose pins are all on one node: they join it to nothing.
    idle: FxHashSet<ElementId>,
}

impl Touching {
    pub(super) fn of(circuit: &Circuit) -> Self {
        let mut starts = vec![0u32; circuit.nodes.len() + 1];
        for (id, _) in circuit.elements() {
            for pin in circuit.pins(id) {
                starts[pin.node.index() + 1] += 1;
            }
        }
        for n in 1..starts.len() {
            starts[n] += starts[n - 1];
        }
        let mut next = starts.clone();
        let mut touches = vec![Touch::default(); starts.last().map_or(0, |&n| n as usize)];
        for (id, _) in circuit.elements() {
            for (number, pin) in circuit.pins(id).iter().enumerate() {
                let at = &mut next[pin.node.index()];
                touches[*at as usize] = Touch { element: id, pin: number as u32 };
                *at += 1;
            }
        }
        let is_idle = |id: &ElementId| match circuit.pins(*id) {
            [first, rest @ ..] => rest.iter().all(|pin| pin.node == first.node),
            [] => false,
        };
        let idle = circuit.elements().map(|(id, _)| id).filter(is_idle).collect();
        Touching { starts, touches, idle }
    }

    /// The pins at a node.
    pub fn at(&self, node: NodeId) -> &[Touch] {
        let at = |n: usize| self.starts.get(n).map_or(0, |&s| s as usize);
        self.touches.get(at(node.index())..at(node.index() + 1)).unwrap_or(&[])
    }

    /// The only element at a node (it may touch it with several pins).
    pub fn only(&self, node: NodeId) -> Option<Touch> {
        let (first, rest) = self.at(node).split_first()?;
        rest.iter().all(|t| t.element == first.element).then_some(*first)
    }

    /// The only element that joins a node to anything: as [`Self::only`], elements with both ends on the node
    /// left out.
    pub fn only_joining(&self, node: NodeId) -> Option<Touch> {
        let joins = |t: &&Touch| self.idle.is_empty() || !self.idle.contains(&t.element);
        let mut touches = self.at(node).iter().filter(joins);
        let first = touches.next()?;
        touches.all(|t| t.element == first.element).then_some(*first)
    }

    /// The pins at a node that pass a current (sensing inputs left out).
    pub fn carrying<'a>(&'a self, circuit: &'a Circuit, node: NodeId) -> impl Iterator<Item = Touch> + 'a {
        self.at(node).iter().copied().filter(move |t| !links::is_sensing(circuit, t.element, t.pin as usize))
    }
}
