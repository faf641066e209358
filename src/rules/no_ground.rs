//! A circuit in which nothing touches ground.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, Circuit};
use crate::finding::{Finding, Severity};

pub const RULE: Rule = Rule {
    name: "no-ground",
    group: Group::Wiring,
    severity: Severity::Error,
    also: None,
    summary: "nothing in the circuit is joined to ground",
    why: "Voltages are counted from node 0. Where no element touches it, no node has a voltage, and a supply \
          that should return there has no way back.",
    remedy: "Name the common return `0` or `gnd` on the elements that meet there.",
    source: None,
    failing: "tide gauge buoy: beacon lamp\n\
              VBAT bat ret 12\n\
              RB bat lamp 820\n\
              DB lamp ret DRED\n\
              .model DRED D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: beacon lamp\n\
              VBAT bat 0 12\n\
              RB bat lamp 820\n\
              DB lamp 0 DRED\n\
              .model DRED D(IS=1e-18 N=2)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let Some((first, _)) = circuit.elements().next() else { return Vec::new() };
    let touched = circuit.elements().any(|(id, _)| circuit.pins(id).iter().any(|p| p.node.0 == 0));
    if touched || may_ground_inside(circuit) {
        return Vec::new();
    }
    vec![
        evidence
            .about(&RULE, first, "no element is joined to ground (node `0` or `gnd`)")
            .label("the first element of a circuit without ground")
            .help(format!("{} {}", RULE.why, RULE.remedy)),
    ]
}

/// A part whose inside is not known may reach ground by itself.
fn may_ground_inside(circuit: &Circuit) -> bool {
    circuit.incomplete
        || circuit
            .elements()
            .any(|(_, e)| e.letter == b'X' && matches!(e.behaviour, Behaviour::Unknown { .. }))
}
