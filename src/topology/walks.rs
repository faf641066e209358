//! Walking along parts that lie in series: from node to node as long as only one other element that carries a direct
//! current leads on.

use super::links::{Link, links};
use super::rails::Rails;
use super::touching::{Touch, Touching};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};

/// Where a walk led.
#[derive(Debug, Clone, PartialEq)]
pub struct Walk {
    /// Elements passed, in order.
    pub passed: Vec<ElementId>,
    /// The last node.
    pub end: NodeId,
    /// Resistances passed, summed, in ohms.
    pub ohms: f64,
}

/// Most elements of one walk.
const MOST: usize = 64;

impl Touching {
    /// The pins at a node through which a direct current may flow, imposed ones included.
    pub fn direct<'a>(&'a self, circuit: &'a Circuit, node: NodeId) -> impl Iterator<Item = Touch> + 'a {
        self.at(node).iter().copied().filter(move |touch| {
            let pin = touch.pin as usize;
            links(circuit, touch.element)
                .any(|(a, b, link)| link != Link::Capacitive && (a == pin || b == pin))
        })
    }

    /// Walks on from `node`, which was reached by `by`, through elements that `through` lets pass, to the first rail or
    /// the first node where the way parts.
    pub fn walk(
        &self,
        circuit: &Circuit,
        rails: &Rails,
        node: NodeId,
        by: ElementId,
        through: impl Fn(&Behaviour) -> bool,
    ) -> Walk {
        let mut walk = Walk { passed: Vec::new(), end: node, ohms: 0.0 };
        let mut came_by = by;
        while !rails.is_rail(walk.end) && walk.passed.len() < MOST {
            let mut others = self.direct(circuit, walk.end).filter(|t| t.element != came_by);
            let (Some(next), None) = (others.next(), others.next()) else { break };
            let behaviour = &circuit.element(next.element).behaviour;
            let Some(far) = far_pin(circuit, next).filter(|_| through(behaviour)) else { break };
            if walk.passed.contains(&next.element) || next.element == by {
                break;
            }
            if let Behaviour::Resistor(ohms) = behaviour {
                walk.ohms += ohms.number;
            }
            walk.passed.push(next.element);
            walk.end = circuit.node(next.element, far);
            came_by = next.element;
        }
        walk
    }
}

/// The pin at the other end of an element's main path.
fn far_pin(circuit: &Circuit, touch: Touch) -> Option<usize> {
    let (one, two) = main_path(circuit, touch.element)?;
    match touch.pin as usize {
        pin if pin == one => Some(two),
        pin if pin == two => Some(one),
        _ => None,
    }
}

/// The pins between which an element's current flows: of a transistor collector and emitter, or drain and source.
pub fn main_path(circuit: &Circuit, id: ElementId) -> Option<(usize, usize)> {
    match circuit.element(id).behaviour {
        Behaviour::Transistor { .. } => Some((0, 2)),
        Behaviour::Unknown { .. } | Behaviour::Coupling { .. } => None,
        _ => Some((0, 1)),
    }
}

/// A resistance or an inductance: what lies in series with a source without changing what it holds at rest.
pub fn is_lead(behaviour: &Behaviour) -> bool {
    matches!(behaviour, Behaviour::Resistor(_) | Behaviour::Inductor { .. })
}
