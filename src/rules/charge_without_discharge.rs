//! A clamp or peak detector whose capacitor is charged and never discharged.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "charge-without-discharge",
    group: Group::Time,
    severity: Severity::Note,
    also: None,
    summary: "a diode charges a capacitor that nothing discharges: the clamp or detector holds its first peak",
    why: "Once charged to the largest peak the capacitor keeps it, and the diode never conducts again: what comes \
          later and is smaller is not seen, and where the voltage goes in the end leakage decides.",
    remedy: "Put a resistor across the diode or the capacitor, its time constant some hundred periods long.",
    source: Some("Clamps want R·C of about a hundred periods, not an open end: common practice"),
    failing: "tide gauge buoy: level shifter of the sounder's receiver\n\
              V1 in 0 SIN(0 2 40k)\n\
              C1 in out 10n\n\
              D1 0 out DCLAMP\n\
              .model DCLAMP D(RS=1)\n\
              *@ watch out\n",
    passing: "tide gauge buoy: level shifter of the sounder's receiver\n\
              V1 in 0 SIN(0 2 40k)\n\
              C1 in out 10n\n\
              D1 0 out DCLAMP\n\
              R1 out 0 220k\n\
              .model DCLAMP D(RS=1)\n\
              *@ watch out\n",
    check: Check::Time(check),
};

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    if swing.span.is_none() {
        return Vec::new();
    }
    let mut found: BTreeMap<NodeId, ElementId> = BTreeMap::new();
    for diode in swing.diodes.iter().filter(|d| d.over_time.is_some()) {
        for pin in 0..2 {
            let node = evidence.circuit.node(diode.element, pin);
            if node != NodeId::GROUND && only_charges(evidence, node) {
                found.entry(node).or_insert(diode.element);
            }
        }
    }
    found.into_iter().map(|(node, id)| finding(evidence, swing, node, id)).collect()
}

/// Whether capacitors and diodes that all point one way are all that leads to a node.
fn only_charges(evidence: &Evidence<'_>, node: NodeId) -> bool {
    let circuit = evidence.circuit;
    let (mut stored, mut ins, mut outs) = (false, 0, 0);
    for touch in evidence.wiring.touching.at(node) {
        let id = touch.element;
        match &circuit.element(id).behaviour {
            Behaviour::Capacitor { farads, .. } => stored |= farads.number > 0.0,
            Behaviour::Diode { model, .. } => {
                // one that breaks down discharges, one with both ends here does nothing
                let breaks = model
                    .is_some_and(|m| circuit.model(m).parameter("bv").is_some_and(|v| v.number.abs() < 40.0));
                if breaks || circuit.node(id, 0) == circuit.node(id, 1) {
                    return false;
                }
                if circuit.node(id, 1) == node { ins += 1 } else { outs += 1 }
            }
            // what only listens carries nothing
            Behaviour::VoltageByVoltage { .. }
            | Behaviour::CurrentByVoltage { .. }
            | Behaviour::VoltageSwitch { .. }
                if circuit.node(id, 0) != node && circuit.node(id, 1) != node => {}
            _ => return false,
        }
    }
    stored && (ins == 0) != (outs == 0)
}

fn finding(evidence: &Evidence<'_>, swing: &Swing, node: NodeId, id: ElementId) -> Finding {
    let level = swing.node(node).and_then(|n| n.over_time);
    let held = level.map_or_else(String::new, |level| {
        format!(" (it stays between {} and {})", quantity(level.min, "V"), quantity(level.max, "V"))
    });
    let message = format!(
        "{} charges the capacitance at `{}`, and nothing discharges it{held}",
        evidence.name(id),
        evidence.node(node)
    );
    let finding = evidence.about(&RULE, id, message).label("charges one way only").about(evidence.node(node));
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
