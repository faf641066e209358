//! A node that one element alone touches.

use super::{Check, Evidence, Group, LooseEnd, Rule};
use crate::circuit::{Behaviour, ElementId, Note, NoteKind, ScopeId};
use crate::finding::{Finding, Label, Severity};
use crate::topology::is_sensing;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "dangling-node",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: Some(Severity::Note),
    summary: "a node has one connection only",
    why: "No current can flow where one element alone touches a node, so that element does nothing.",
    remedy: "Join the node to what it was meant for, or take the element out. Where the end is meant to be open, \
             say so: `*@ watch NODE` for an output that is only measured, `*@ accept dangling-node NODE because …` \
             for a test pad.",
    source: None,
    failing: "tide gauge buoy: charge indicator\n\
              VSOLAR panel 0 18\n\
              R1 panel lamp 2k2\n\
              D1 lamp 0 DGREEN\n\
              R2 panel spare 10k\n\
              .model DGREEN D(IS=1e-20 N=2)\n",
    passing: "tide gauge buoy: charge indicator\n\
              VSOLAR panel 0 18\n\
              R1 panel lamp 2k2\n\
              D1 lamp 0 DGREEN\n\
              R2 panel sense 10k\n\
              R3 sense 0 2k2\n\
              .model DGREEN D(IS=1e-20 N=2)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let mut ends: Vec<&LooseEnd> = evidence.loose_ends().iter().filter(|e| e.meant.is_none()).collect();
    ends.sort_by_key(|e| (e.touch.element, e.touch.pin));
    let groups: Vec<&[&LooseEnd]> = ends.chunk_by(|a, b| a.touch.element == b.touch.element).collect();
    let mut by_scope: BTreeMap<ScopeId, Vec<&[&LooseEnd]>> = BTreeMap::new();
    for &group in &groups {
        by_scope.entry(evidence.circuit.element(group[0].touch.element).scope).or_default().push(group);
    }
    let told = |groups: &Vec<&[&LooseEnd]>| match groups.as_slice() {
        [[one]] if super::both_ends_on_one_node::is_other_end(evidence, one) => Vec::new(),
        [[one], [two]] if may_belong_together(evidence, one, two) => {
            vec![together(judge(evidence, &[one]), judge(evidence, &[two]))]
        }
        groups => groups.iter().map(|ends| judge(evidence, ends)).collect(),
    };
    by_scope.values().flat_map(told).collect()
}

/// The only two loose ends of a circuit or subcircuit are likely two halves of one node, or the two sides of an
/// element that is missing: one cause. Not where somebody accepts the one and wants to hear of the other.
fn may_belong_together(evidence: &Evidence<'_>, one: &LooseEnd, two: &LooseEnd) -> bool {
    let accepts = |note: &Note| matches!(&note.kind, NoteKind::Accept { rule, .. } if rule == RULE.name);
    !one.unused_pin && !two.unused_pin && !evidence.circuit.notes.iter().any(accepts)
}

fn together(mut one: Finding, two: Finding) -> Finding {
    if let [node, name, ..] = two.subjects.as_slice() {
        one.message.push_str(&format!(", and node `{node}` to {name} and nothing else"));
    }
    one.labels.push(Label { span: two.span, message: two.label });
    one.subjects.extend(two.subjects);
    one.help
        .push_str(" Perhaps the two ends are meant to be one node, or an element between them is missing.");
    one
}

/// All loose ends of one element are one finding.
fn judge(evidence: &Evidence<'_>, ends: &[&LooseEnd]) -> Finding {
    let element = ends[0].touch.element;
    let pins = evidence.circuit.pins(element);
    let name = evidence.name(element);
    let nodes: Vec<String> = ends.iter().map(|e| format!("`{}`", evidence.node(e.node))).collect();
    let message = match nodes.as_slice() {
        [node] if ends[0].unused_pin => format!("node {node} leads to {name} inside a part and nowhere else"),
        [node] if listens(evidence, ends[0]) => {
            format!("nothing drives node {node}: only {name} listens to it")
        }
        [node] => format!("node {node} is joined to {name} and nothing else"),
        _ => format!("{name} is joined to nothing else: its nodes {} end there", super::list(&nodes)),
    };
    let span = pins.get(ends[0].touch.pin as usize).map_or(evidence.statement(element), |p| p.span);
    let scope = evidence.circuit.element(element).scope;
    let mut finding =
        evidence.at(&RULE, scope, span, message).label(format!("only {name} touches this node"));
    for (end, node) in ends.iter().zip(&nodes) {
        finding = finding.about(node.trim_matches('`'));
        if end.node != ends[0].node
            && let Some(pin) = pins.get(end.touch.pin as usize)
        {
            finding = finding.also(pin.span, format!("nor does anything else touch {node}"));
        }
    }
    finding = finding.about(name);
    if ends.iter().all(|e| e.unused_pin && !super::support::is_needed_port(evidence, e)) {
        finding.severity = Severity::Note;
        return finding.help(
            "An unused pin of a part is usual; if it is to be joined, look at the node's name on the instance's line.",
        );
    }
    let node = evidence.circuit.text(evidence.circuit.nodes[ends[0].node.index()].name);
    finding.help(format!(
        "{} Join it to what it was meant for, or take it out; an output that is only measured takes the note \
         `*@ watch {node}`.",
        why(evidence, element)
    ))
}

fn listens(evidence: &Evidence<'_>, end: &LooseEnd) -> bool {
    let circuit = evidence.circuit;
    is_sensing(circuit, end.touch.element, end.touch.pin as usize)
        || (circuit.element(end.touch.element).letter == b'M' && end.touch.pin == 1)
}

fn why(evidence: &Evidence<'_>, element: ElementId) -> &'static str {
    match evidence.circuit.element(element).behaviour {
        Behaviour::CurrentSource(_)
        | Behaviour::CurrentByCurrent { .. }
        | Behaviour::CurrentByVoltage { .. } => {
            "The current that this source drives has nowhere to go, so the circuit has no solution."
        }
        Behaviour::VoltageSource(_) => "A source that feeds nothing has no effect.",
        _ => RULE.why,
    }
}
