//! States that hang on the temperature.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::State;
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating};

pub const RULE: Rule = Rule {
    name: "temperature-decides",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "temperature moves a drop by more than the margin of its state",
    why: "A drop falls by about 2 mV for each degree. Where the margin is smaller than what the declared temperatures make of that, the state is decided by the weather.",
    remedy: "Leave more margin, or check the state at both ends with an `expect` note.",
    source: Some("About -2 mV/K for silicon: Sedra & Smith, Microelectronic Circuits"),
    failing: "tide gauge buoy: hatch lamp\n\
              *@ range temp -20 60\n\
              V1 p 0 5\n\
              R1 p a 10k\n\
              R2 a 0 1.51k\n\
              D1 a 0 DH\n\
              .model DH D\n",
    passing: "tide gauge buoy: hatch lamp\n\
              *@ range temp -20 60\n\
              V1 p 0 5\n\
              R1 p a 1k\n\
              D1 a 0 DH\n\
              .model DH D\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (id, results) in by_diode(operating) {
        let forward = results.iter().filter(|(_, d)| matches!(d.state, State::Conducting | State::Blocking));
        let drops = || forward.clone().map(|(_, d)| d.drop.volts);
        let moved = drops().fold(f64::NEG_INFINITY, f64::max) - drops().fold(f64::INFINITY, f64::min);
        let near = |d: &DiodeResult| d.view.map(|v| (v.open_circuit - d.drop.volts).abs());
        let least =
            forward.clone().filter_map(|&(n, d)| near(d).map(|m| (n, m))).min_by(|a, b| a.1.total_cmp(&b.1));
        let Some((number, margin)) = least.filter(|(_, margin)| moved > 1e-3 && *margin < moved) else {
            continue;
        };
        let message = format!(
            "over the declared temperatures the drop of {} moves by {}, more than its margin of {}{}",
            evidence.name(id),
            quantity(moved, "V"),
            quantity(margin, "V"),
            in_case(operating, number)
        );
        let finding = evidence.about(&RULE, id, message).label("the temperature decides its state");
        findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
    }
    findings
}
