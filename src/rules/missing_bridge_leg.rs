//! A bridge rectifier of three legs.

use super::reversed_bridge_leg::{Leg, legs};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::Driven;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "missing-bridge-leg",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a bridge rectifier has three legs: one is missing",
    why: "One output of the bridge is joined to both ends of the winding, the other to one of them only, so the current \
          has no way back in every other half-wave.",
    remedy: "Put the fourth diode in.",
    source: Some("Bridge rectifier, common practice"),
    failing: "tide gauge buoy: bench supply\n\
              VSEC w1 w2 17\n\
              RSEC w1 ac1 0.8\n\
              D1 ac1 raw DRECT\n\
              D2 w2 raw DRECT\n\
              D3 0 ac1 DRECT\n\
              C1 raw 0 2200u\n\
              R1 raw 0 100\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    passing: "tide gauge buoy: bench supply\n\
              VSEC w1 w2 17\n\
              RSEC w1 ac1 0.8\n\
              D1 ac1 raw DRECT\n\
              D2 w2 raw DRECT\n\
              D3 0 ac1 DRECT\n\
              D4 0 w2 DRECT\n\
              C1 raw 0 2200u\n\
              R1 raw 0 100\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let mut findings = Vec::new();
    // with a centre tap each half of the winding has a way back of its own
    let is_tapped = |d: &Driven| d.ends.len() > 2 && d.ends.iter().any(|&n| evidence.wiring.rails.is_rail(n));
    for driven in evidence.wiring.driven.iter().filter(|d| !is_tapped(d)) {
        let outputs = legs(evidence, driven);
        for (&whole, two) in &outputs {
            let [one, other] = two.as_slice() else { continue };
            if one.end == other.end || one.out != other.out {
                continue;
            }
            for (&half, legs) in &outputs {
                let [single] = legs.as_slice() else { continue };
                let belongs = single.out != one.out
                    && [one.end, other.end].contains(&single.end)
                    && are_of_one_kind(evidence, &[one.diode, other.diode, single.diode]);
                let bridges = || has_load(evidence, &driven.ends, (whole, half), &[*one, *other, *single]);
                if half != whole && belongs && !leads_elsewhere(evidence, half) && bridges() {
                    let bare = if single.end == one.end { other.end } else { one.end };
                    if has_transistor(evidence, bare) {
                        continue;
                    }
                    findings.push(judge(evidence, (whole, [*one, *other]), (half, *single), bare));
                }
            }
        }
    }
    findings
}

/// A transistor there may be the fourth leg.
fn has_transistor(evidence: &Evidence<'_>, node: NodeId) -> bool {
    let is_transistor = |id| matches!(evidence.circuit.element(id).behaviour, Behaviour::Transistor { .. });
    node != NodeId::GROUND && evidence.wiring.touching.at(node).iter().any(|t| is_transistor(t.element))
}

/// A bridge is built of one kind of diode; a Zener diode, a clamp and a lamp are none.
fn are_of_one_kind(evidence: &Evidence<'_>, diodes: &[ElementId]) -> bool {
    let models: Vec<Option<&str>> = diodes.iter().map(|&id| evidence.model_name(id)).collect();
    models.windows(2).all(|pair| pair[0] == pair[1])
}

/// The single leg is a clamp to a supply of its own, not the way back of the load.
fn leads_elsewhere(evidence: &Evidence<'_>, output: NodeId) -> bool {
    output != NodeId::GROUND && evidence.wiring.rails.is_rail(output)
}

/// Nodes of a load that are gone through at most.
const WIDEST: usize = 500;

/// Something leads from one output to the other past the winding and its legs: what else would the bridge feed?
fn has_load(evidence: &Evidence<'_>, ends: &[NodeId], outputs: (NodeId, NodeId), legs: &[Leg]) -> bool {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut seen = FxHashSet::from_iter([outputs.0]);
    let mut open = vec![outputs.0];
    while let Some(node) = open.pop() {
        for touch in evidence.wiring.touching.carrying(circuit, node) {
            if legs.iter().any(|l| l.diode == touch.element) {
                continue;
            }
            for pin in circuit.pins(touch.element) {
                if pin.node == outputs.1 {
                    return true;
                }
                let passes = !rails.is_rail(pin.node) && !ends.contains(&pin.node);
                if passes && seen.len() < WIDEST && seen.insert(pin.node) {
                    open.push(pin.node);
                }
            }
        }
    }
    false
}

fn judge(evidence: &Evidence<'_>, whole: (NodeId, [Leg; 2]), half: (NodeId, Leg), bare: NodeId) -> Finding {
    let name = evidence.name(half.1.diode);
    let [one, two] = whole.1.map(|l| evidence.name(l.diode));
    let (plus, minus, end) = (evidence.node(whole.0), evidence.node(half.0), evidence.node(bare));
    let message = format!(
        "{one} and {two} join both ends of the winding to `{plus}`, but only {name} joins one of them to `{minus}`: a leg \
         between `{minus}` and `{end}` is missing"
    );
    let mut finding = evidence.about(&RULE, half.1.diode, message).label("has no partner");
    for leg in whole.1 {
        finding = finding.also(evidence.statement(leg.diode), "one of the pair on the other side");
    }
    finding.subjects.extend([one, two, end]);
    let diodes: Vec<ElementId> = whole.1.iter().map(|l| l.diode).chain([half.1.diode]).collect();
    evidence.name_nodes(&mut finding, &diodes);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
