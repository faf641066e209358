//! Puts the time pass together.

use super::conditions::over_conditions;
use super::result::{DiodeSwing, NodeSwing, Swing};
use crate::circuit::{Behaviour, Circuit, NodeId};
use crate::config::Options;
use crate::operating::Operating;

/// What moves over the conditions and, where sources move, over time.
pub fn follow(circuit: &Circuit, operating: &Operating, _options: &Options) -> Swing {
    let mut ranges = over_conditions(operating);
    let diodes = circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    Swing {
        diodes: diodes
            .map(|(element, _)| DiodeSwing {
                element,
                over_time: None,
                not_evaluated: None,
                over_conditions: ranges.remove(&element),
            })
            .collect(),
        nodes: (1..circuit.nodes.len())
            .map(|n| NodeSwing { node: NodeId::new(n), over_time: None })
            .collect(),
        ..Swing::default()
    }
}
