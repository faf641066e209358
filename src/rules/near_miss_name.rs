//! A node with one connection whose name is one letter away from another node's.

use super::{Check, Evidence, Group, LooseEnd, Rule};
use crate::circuit::NodeId;
use crate::finding::{Edit, Finding, Severity};

pub const RULE: Rule = Rule {
    name: "near-miss-name",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a node's name is one letter away from another's, and it has one connection only",
    why: "A misspelt name makes a new node, and the element on it is cut off from the node it was meant for.",
    remedy: "Write the name of the other node; if the node is meant to be one of its own, join something to it.",
    source: None,
    failing: "tide gauge buoy: sonar supply\n\
              VBAT battery 0 12\n\
              D1 battery supply DSCH\n\
              R1 suply 0 470\n\
              C1 supply 0 100u\n\
              R2 supply 0 10k\n\
              .model DSCH D(IS=1u N=1.05)\n",
    passing: "tide gauge buoy: sonar supply\n\
              VBAT battery 0 12\n\
              D1 battery supply DSCH\n\
              R1 supply 0 470\n\
              C1 supply 0 100u\n\
              .model DSCH D(IS=1u N=1.05)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let told = evidence.loose_ends().iter();
    told.filter_map(|end| end.meant.filter(|&m| m != end.node).and_then(|m| judge(evidence, end, m)))
        .collect()
}

fn judge(evidence: &Evidence<'_>, end: &LooseEnd, meant: NodeId) -> Option<Finding> {
    let element = end.touch.element;
    let pin = evidence.circuit.pins(element).get(end.touch.pin as usize)?;
    let (node, name) = (evidence.node(end.node), evidence.name(element));
    let other = evidence.node(meant);
    let touches = evidence.wiring.touching.at(meant);
    let message = format!(
        "node `{node}` is joined to {name} and nothing else; it is one letter away from `{other}`, which has {}",
        super::count(touches.len(), "connection")
    );
    let mut finding = evidence
        .at(&RULE, evidence.circuit.element(element).scope, pin.span, message)
        .label(format!("`{other}` meant?"))
        .about(node)
        .about(name)
        .about(other.clone())
        .help(format!("{} {}", RULE.why, RULE.remedy));
    if let Some(touch) = touches.first()
        && let Some(place) = evidence.circuit.pins(touch.element).get(touch.pin as usize)
    {
        finding = finding.also(place.span, format!("`{other}` is written here"));
    }
    let written = evidence.circuit.text(evidence.circuit.nodes.get(meant.index())?.name).to_owned();
    Some(finding.fix(format!("write `{written}`"), vec![Edit { span: pin.span, replacement: written }]))
}
