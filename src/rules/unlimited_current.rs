//! A loop of sources and conducting diodes with a voltage left over and no resistance to take it.

use super::{Check, Evidence, Group, Rule, Shown, causes, is_told};
use crate::circuit::Behaviour;
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "unlimited-current",
    group: Group::States,
    severity: Severity::Error,
    also: None,
    summary: "sources drive an unlimited current through diodes, since nothing in the loop has a resistance",
    why: "The voltages around the loop exceed the drops of its diodes, so whatever current flows there the sum \
          does not come to zero: the model has no solution, and the real parts would find theirs the hard way.",
    remedy: "Put the resistance into the loop that limits the current, turn the diode round that lies forward \
             across a source, or give its model `RS`.",
    source: Some(
        "A diode-only path between fixed potentials whose drops sum to less than their difference is \
                  what makes such a network unsolvable: Chua, Desoer & Kuh, Linear and Nonlinear Circuits, \
                  McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: reference from two diodes\n\
              VCC vcc 0 3.3\n\
              D1 vcc mid DSW\n\
              D2 mid 0 DSW\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: reference from two diodes\n\
              VCC vcc 0 3.3\n\
              R1 vcc ref 1k\n\
              D1 ref mid DSW\n\
              D2 mid 0 DSW\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::None)
        .iter()
        .filter(|cause| is_ours(evidence, cause) && !is_told(evidence, &cause.cause.elements))
        .map(|cause| super::support::finding(&RULE, evidence, operating, cause, "in the loop"))
        .collect()
}

/// A loop with a diode in it: no current source takes part.
pub fn is_ours(evidence: &Evidence<'_>, cause: &Shown<'_>) -> bool {
    let has = |wanted: fn(&Behaviour) -> bool| {
        cause.cause.elements.iter().any(|&id| wanted(&evidence.circuit.element(id).behaviour))
    };
    has(|b| matches!(b, Behaviour::Diode { .. })) && !has(is_current)
}

/// Imposes a current.
pub fn is_current(behaviour: &Behaviour) -> bool {
    matches!(
        behaviour,
        Behaviour::CurrentSource(_) | Behaviour::CurrentByVoltage { .. } | Behaviour::CurrentByCurrent { .. }
    )
}
