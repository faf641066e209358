//! Leakage into nodes of high impedance.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::State;
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating, Trust};

pub const RULE: Rule = Rule {
    name: "leakage-matters",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "a blocking diode's leakage moves a node of high impedance",
    why: "A blocking diode is no open circuit: its leakage flows through whatever it sees, and in a large resistance that is a voltage. It doubles about every 10 degrees.",
    remedy: "Lower the resistance that it sees, take a diode of low leakage, or count the leakage in.",
    source: None,
    failing: "tide gauge buoy: input clamp of the conductivity probe\n\
              V1 p 0 2\n\
              R1 p in 100meg\n\
              V2 rail 0 5\n\
              D1 in rail DBAT\n\
              .model DBAT D(IS=200n N=1.05)\n",
    passing: "tide gauge buoy: input clamp of the conductivity probe\n\
              V1 p 0 2\n\
              R1 p in 10k\n\
              V2 rail 0 5\n\
              D1 in rail DBAT\n\
              .model DBAT D(IS=1n N=1.05)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (id, results) in by_diode(operating) {
        let Some((number, told)) = results.iter().find_map(|&(n, d)| Some((n, leaks(d)?))) else { continue };
        let message = format!("{} {told}{}", evidence.name(id), in_case(operating, number));
        let finding = evidence.about(&RULE, id, message).label("blocks, but leaks");
        findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
    }
    findings
}

/// Volts that a leakage must make before anybody wants to know.
const LEAST: f64 = 0.05;

fn leaks(diode: &DiodeResult) -> Option<String> {
    let (view, error) = (diode.view?, diode.error?);
    let shift = error.current * view.resistance;
    let is_reverse = diode.state == State::Blocking && view.open_circuit <= 0.0;
    if !is_reverse || diode.trust == Some(Trust::Good) || shift < LEAST || !diode.knee?.is_known {
        return None;
    }
    Some(format!(
        "may leak {} in reverse, which makes {} across the {} that it sees",
        quantity(error.current, "A"),
        quantity(shift, "V"),
        quantity(view.resistance, "Ω")
    ))
}
