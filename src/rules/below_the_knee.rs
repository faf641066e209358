//! Zener diodes that carry less than their knee.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating};

pub const RULE: Rule = Rule {
    name: "below-the-knee",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "a Zener diode carries too little current for its breakdown voltage to hold",
    why: "Below the knee a Zener's voltage sags: its slope is 400 to 1000 ohms at a quarter to one milliampere, against 2 to 40 ohms at the test current, so the constant breakdown voltage is too high.",
    remedy: "Give it more current (a smaller series resistor), or a part that is made for little.",
    source: Some("Z_ZK at I_ZK against Z_ZT at I_ZT of the 1N4728A series (Fairchild data sheet)"),
    failing: "tide gauge buoy: reference of the sonar\n\
              V1 bat 0 12\n\
              R1 bat ref 470k\n\
              D1 0 ref DZ\n\
              .model DZ D(BV=5.1 IBV=5m)\n",
    passing: "tide gauge buoy: reference of the sonar\n\
              V1 bat 0 12\n\
              R1 bat ref 680\n\
              D1 0 ref DZ\n\
              .model DZ D(BV=5.1 IBV=5m)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (id, results) in by_diode(operating) {
        let rated = rated(evidence, id);
        let low = |d: &DiodeResult| d.current.known().is_some_and(|i| i < 0.0 && -i < rated / 10.0);
        let found = results.iter().find(|(_, d)| d.state == State::Breakdown && low(d));
        let Some(&(number, diode)) = found else { continue };
        let current = diode.current.known().map_or(0.0, f64::abs);
        let message = format!(
            "{} is to hold {}, but carries only {} of the {} at which it has that voltage{}",
            evidence.name(id),
            quantity(diode.breakdown.unwrap_or(0.0), "V"),
            quantity(current, "A"),
            quantity(rated, "A"),
            in_case(operating, number)
        );
        let finding = evidence.about(&RULE, id, message).label("below its knee");
        findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
    }
    findings
}

/// The current at which the model states its breakdown voltage; 1 mA where it does not say.
fn rated(evidence: &Evidence<'_>, id: ElementId) -> f64 {
    let Behaviour::Diode { model: Some(model), area } = evidence.circuit.element(id).behaviour else {
        return 1e-3;
    };
    let given = evidence.circuit.model(model).parameter("ibv").map(|v| v.number.abs()).filter(|i| *i > 0.0);
    given.unwrap_or(1e-3) * if area > 0.0 { area } else { 1.0 }
}
