//! Drops that are the built-in potential.

use super::support::by_diode;
use super::{Check, Evidence, Group, Rule};
use crate::circuit::Behaviour;
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DropOrigin, Operating};

pub const RULE: Rule = Rule {
    name: "drop-taken-from-vj",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "a drop is given that is the model's built-in potential",
    why: "VJ is the built-in potential that shapes the junction's capacitance. It is no forward drop: that follows from IS, N and the current.",
    remedy: "Take the note away and let IS and N speak, or give the drop that the data sheet prints at your current.",
    source: None,
    failing: "tide gauge buoy: latch relay\n\
              *@ drop DFW 1\n\
              V1 p 0 12\n\
              R1 p a 1k\n\
              D1 a 0 DFW\n\
              .model DFW D(IS=14n N=1.98 VJ=1)\n",
    passing: "tide gauge buoy: latch relay\n\
              *@ drop DFW 0.65\n\
              V1 p 0 12\n\
              R1 p a 1k\n\
              D1 a 0 DFW\n\
              .model DFW D(IS=14n N=1.98 VJ=1)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (id, results) in by_diode(operating) {
        let Some((_, diode)) = results.first() else { continue };
        let Behaviour::Diode { model: Some(model), .. } = evidence.circuit.element(id).behaviour else {
            continue;
        };
        let built_in = evidence.circuit.model(model).parameter("vj").map(|v| v.number);
        let same = built_in.is_some_and(|v| (v - diode.drop.volts).abs() <= 1e-9 * v.abs());
        // the usual drop of silicon is no built-in potential, whatever it coincides with
        let usual = (diode.drop.volts - 0.7).abs() <= 0.0501;
        if diode.drop.origin != DropOrigin::Note || !same || usual {
            continue;
        }
        let message = format!(
            "the drop of {} that a note gives `{}` is VJ of its model",
            quantity(diode.drop.volts, "V"),
            evidence.name(id)
        );
        let finding = evidence.about(&RULE, id, message).label("drop and VJ are one number");
        findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
    }
    findings
}
