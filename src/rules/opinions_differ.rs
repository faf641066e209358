//! Diodes that the second opinion sees in another state.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::State;
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating};

pub const RULE: Rule = Rule {
    name: "opinions-differ",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "the exponential law sees a diode in another state than its drop does",
    why: "A knee is soft: near it a diode carries current before its drop is reached, and beside another diode it takes its share although its drop is a little higher.",
    remedy: "Believe neither state where it matters; give the diode more headroom, or look at it with the drop of its true current.",
    source: None,
    failing: "tide gauge buoy: surge clamp of the data line\n\
              V1 line 0 0.62\n\
              R1 line a 1meg\n\
              D1 a 0 DCL\n\
              *@ drop D1 0.7\n\
              .model DCL D(IS=1n N=1.6)\n",
    passing: "tide gauge buoy: surge clamp of the data line\n\
              V1 line 0 5\n\
              R1 line a 1k\n\
              D1 a 0 DCL\n\
              .model DCL D(IS=1n N=1.6)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (id, results) in by_diode(operating) {
        if let Some((number, told)) = results.iter().find_map(|&(n, d)| Some((n, differs(d)?))) {
            let message = format!("{} {told}{}", evidence.name(id), in_case(operating, number));
            let finding = evidence.about(&RULE, id, message).label("its state is a matter of opinion");
            findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
        }
    }
    findings
}

/// Volts by which its own current moves what a diode sees before that counts as conducting.
const MOVED: f64 = 0.1;

fn differs(diode: &DiodeResult) -> Option<String> {
    let (refined, knee, current) = (diode.refined?, diode.knee?, diode.current.known()?);
    let carries = quantity(refined.current, "A");
    match diode.state {
        State::Blocking => {
            let moved = diode.view.map_or(0.0, |v| v.open_circuit - refined.voltage);
            let conducts = refined.current > 0.0 && (moved > MOVED || refined.current > 0.3 * knee.reference);
            let drop = quantity(diode.drop.volts, "V");
            conducts.then(|| {
                format!("blocks by its drop of {drop}, yet by the exponential law it carries {carries}")
            })
        }
        State::Conducting | State::Breakdown if refined.current.abs() < 0.1 * current.abs() => {
            let by = quantity(current, "A");
            Some(format!("carries {by} by its drop, yet by the exponential law only {carries}"))
        }
        _ => None,
    }
}
