//! A part of the circuit that nothing joins to ground.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{ElementId, NodeId};
use crate::finding::{Finding, Severity};
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "floating-part",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a part of the circuit is joined neither to ground nor to the rest",
    why: "Its voltages against ground are not determined, and it exchanges nothing with the rest. Usually one \
          node name on its border is wrong or its return is missing.",
    remedy: "Join its common return to ground, or to the part that it belongs to.",
    source: None,
    failing: "tide gauge buoy: beacon and hatch lamp\n\
              VBAT bat 0 12\n\
              R1 bat 0 10k\n\
              VAUX aux ret 5\n\
              R2 aux lamp 330\n\
              D1 lamp ret DRED\n\
              .model DRED D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: beacon and hatch lamp\n\
              VBAT bat 0 12\n\
              R1 bat 0 10k\n\
              VAUX aux 0 5\n\
              R2 aux lamp 330\n\
              D1 lamp 0 DRED\n\
              .model DRED D(IS=1e-18 N=2)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let related = &evidence.wiring.related;
    if evidence.is_groundless() || related.count() < 2 {
        return Vec::new();
    }
    let mut parts: Vec<Vec<ElementId>> = vec![Vec::new(); related.count()];
    for (id, _) in evidence.circuit.elements() {
        if let Some(pin) = evidence.circuit.pins(id).first() {
            let group = related.of(pin.node);
            if group != 0 {
                parts[group].push(id);
            }
        }
    }
    let loose: FxHashSet<NodeId> = evidence.loose_ends().iter().map(|end| end.node).collect();
    let is_told = |part: &Vec<ElementId>| {
        part.iter().any(|&id| evidence.circuit.pins(id).iter().any(|pin| loose.contains(&pin.node)))
    };
    let mut parts: Vec<_> = parts.into_iter().filter(|part| !is_told(part)).collect();
    parts.sort();
    parts.iter().filter_map(|part| judge(evidence, part)).collect()
}

fn judge(evidence: &Evidence<'_>, part: &[ElementId]) -> Option<Finding> {
    let (&first, others) = part.split_first()?;
    // an element across one node, and nothing else, is told by its own rule
    let pins = evidence.circuit.pins(first);
    if others.is_empty() && pins.iter().all(|p| p.node == pins[0].node) {
        return None;
    }
    let names: Vec<String> = part.iter().map(|&id| evidence.name(id)).collect();
    let verb = if names.len() == 1 { "is" } else { "are" };
    let message = format!("{} {verb} joined neither to ground nor to the rest of the circuit", list(&names));
    let mut finding = evidence.about(&RULE, first, message).label("this part floats");
    for &id in others.iter().take(3) {
        finding = finding.also(evidence.statement(id), "belongs to it");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
