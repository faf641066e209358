//! A two-terminal element with both ends on one node.

use super::{Check, Evidence, Rule};
use crate::circuit::{Behaviour, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::topology::dc_value;

pub const RULE: Rule = Rule {
    name: "both-ends-on-one-node",
    group: "wiring",
    severity: Severity::Warning,
    summary: "both ends of an element are on one node",
    why: "An element across one node has no voltage and takes no part in the circuit; usually one of its node \
          names is wrong.",
    remedy: "Give one end the node it was meant for, or take the element out.",
    source: None,
    failing: "tide gauge buoy: float switch input\n\
              VCC vcc 0 3.3\n\
              R1 vcc float 10k\n\
              R2 float 0 100k\n\
              C1 float float 100n\n",
    passing: "tide gauge buoy: float switch input\n\
              VCC vcc 0 3.3\n\
              R1 vcc float 10k\n\
              R2 float 0 100k\n\
              C1 float 0 100n\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    evidence.circuit.elements().filter_map(|(id, _)| judge(evidence, id)).collect()
}

fn judge(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let element = circuit.element(id);
    if matches!(
        element.behaviour,
        Behaviour::Unknown { .. } | Behaviour::Transistor { .. } | Behaviour::Coupling { .. }
    ) {
        return None;
    }
    let [first, second, ..] = circuit.pins(id) else { return None };
    if first.node != second.node || tied_outside(evidence, id) {
        return None;
    }
    let (name, node) = (evidence.name(id), evidence.node(first.node));
    let mut finding = evidence
        .about(&RULE, id, format!("both ends of {name} are on node `{node}`"))
        .about(node)
        .also(first.span, "one end")
        .also(second.span, "the other end")
        .help(format!("{} {}", RULE.why, RULE.remedy));
    if let Behaviour::VoltageSource(source) = &element.behaviour {
        let volts = dc_value(source).0;
        if volts != 0.0 {
            finding.severity = Severity::Error;
            finding.message = format!(
                "{name} is to hold {} across itself: both its ends are on node `{}`",
                quantity(volts, "V"),
                evidence.node(first.node)
            );
            finding.help = format!("No voltage other than 0 V can stand across one node. {}", RULE.remedy);
        }
    }
    Some(finding)
}

/// Inside a subcircuit the two ends have names of their own, and the instance ties them together: usual.
fn tied_outside(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let [first, second, ..] = evidence.circuit.pins(id) else { return false };
    evidence.circuit.element(id).scope != crate::circuit::ScopeId::ROOT
        && !evidence.sources.slice(first.span).eq_ignore_ascii_case(evidence.sources.slice(second.span))
}
