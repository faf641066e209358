//! A two-terminal element with both ends on one node.

use super::{Check, Evidence, Group, LooseEnd, Rule};
use crate::circuit::{Behaviour, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::topology::dc_value;

pub const RULE: Rule = Rule {
    name: "both-ends-on-one-node",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: Some(Severity::Error),
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
    let judged = |(id, _)| judge(evidence, id).or_else(|| deaf(evidence, id));
    evidence.circuit.elements().filter_map(judged).collect()
}

/// A controlled source or switch that listens between a node and itself hears nothing, ever.
fn deaf(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let listens = matches!(
        circuit.element(id).behaviour,
        Behaviour::VoltageByVoltage { .. }
            | Behaviour::CurrentByVoltage { .. }
            | Behaviour::VoltageSwitch { .. }
    );
    let [_, _, one, two, ..] = circuit.pins(id) else { return None };
    let tied = circuit.element(id).scope != crate::circuit::ScopeId::ROOT
        && !evidence.sources.slice(one.span).eq_ignore_ascii_case(evidence.sources.slice(two.span));
    if !listens || one.node != two.node || tied {
        return None;
    }
    let (name, node) = (evidence.name(id), evidence.node(one.node));
    let message = format!("both control nodes of {name} are `{node}`, so it never hears anything but 0 V");
    Some(
        evidence
            .about(&RULE, id, message)
            .about(node)
            .also(one.span, "one input")
            .also(two.span, "the other input")
            .help(format!("{} {}", RULE.why, RULE.remedy)),
    )
}

/// The loose end that an element across one node was probably meant to reach: there is one of each in the
/// circuit or subcircuit, so they have one cause.
pub fn is_other_end(evidence: &Evidence<'_>, end: &LooseEnd) -> bool {
    let scope = evidence.circuit.element(end.touch.element).scope;
    evidence.shorted_in(scope) == 1
}

fn other_end<'e>(evidence: &'e Evidence<'_>, id: ElementId) -> Option<&'e LooseEnd> {
    let scope = evidence.circuit.element(id).scope;
    let [end] = evidence.loose_ends_in(scope) else { return None };
    (end.meant.is_none() && !end.unused_pin && is_other_end(evidence, end)).then_some(end)
}

/// Both ends of a two-terminal element (or output) are on one node by its own line.
pub fn is_shorted(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let stands_for_itself = matches!(
        circuit.element(id).behaviour,
        Behaviour::Unknown { .. } | Behaviour::Transistor { .. } | Behaviour::Coupling { .. }
    );
    let [first, second, ..] = circuit.pins(id) else { return false };
    !stands_for_itself && first.node == second.node && !tied_outside(evidence, id)
}

fn judge(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let element = circuit.element(id);
    if !is_shorted(evidence, id) {
        return None;
    }
    let [first, second, ..] = circuit.pins(id) else { return None };
    let (name, node) = (evidence.name(id), evidence.node(first.node));
    let mut finding = evidence
        .about(&RULE, id, format!("both ends of {name} are on node `{node}`"))
        .about(node)
        .also(first.span, "one end")
        .also(second.span, "the other end")
        .help(format!("{} {}", RULE.why, RULE.remedy));
    if let Some(end) = other_end(evidence, id)
        && let Some(pin) = circuit.pins(end.touch.element).get(end.touch.pin as usize)
    {
        let (node, only) = (evidence.node(end.node), evidence.name(end.touch.element));
        finding = finding
            .also(pin.span, format!("`{node}` is joined to nothing but {only}: meant for {name}?"))
            .about(node)
            .about(only);
    }
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
