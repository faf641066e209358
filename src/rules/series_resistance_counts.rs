//! Diodes whose series resistance is no small thing at their current.

use super::support::{by_diode, folded, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, ModelId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating};

pub const RULE: Rule = Rule {
    name: "series-resistance-counts",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "a diode's series resistance adds more than 50 mV to its drop",
    why: "At high current a diode is a drop and a resistor: the voltage at its terminals is higher than the drop, and grows with the current in a straight line.",
    remedy: "Count with the terminal voltage; where the difference matters, take a larger diode.",
    source: None,
    failing: "tide gauge buoy: charger\n\
              V1 in 0 12\n\
              R1 in a 10\n\
              D1 a 0 DREC\n\
              .model DREC D(IS=2n N=1.8 RS=0.2)\n",
    passing: "tide gauge buoy: charger\n\
              V1 in 0 12\n\
              R1 in a 1k\n\
              D1 a 0 DREC\n\
              .model DREC D(IS=2n N=1.8 RS=0.2)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    // one finding for each model: what its diodes share
    let mut models: Vec<(Option<ModelId>, Vec<ElementId>, Vec<Finding>)> = Vec::new();
    for (id, results) in by_diode(operating) {
        // in breakdown it is the slope that a Zener's data sheet gives, and meant
        let added = |d: &DiodeResult| match (d.state, d.current.known()) {
            (State::Conducting, Some(i)) => i.abs() * d.series,
            _ => 0.0,
        };
        let worst = results.iter().max_by(|a, b| added(a.1).total_cmp(&added(b.1)));
        let Some(&(number, diode)) = worst.filter(|(_, d)| added(d) > LEAST) else { continue };
        let message = format!(
            "the series resistance of {} ({}) adds {} to its drop of {}{}",
            evidence.name(id),
            quantity(diode.series, "Ω"),
            quantity(added(diode), "V"),
            quantity(diode.drop.volts, "V"),
            in_case(operating, number)
        );
        let finding = evidence.about(&RULE, id, message).label("more than a drop");
        let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
        let model = match evidence.circuit.element(id).behaviour {
            Behaviour::Diode { model, .. } => model,
            _ => None,
        };
        match models.iter_mut().find(|(known, ..)| *known == model) {
            Some((_, ids, list)) => {
                ids.push(id);
                list.push(finding);
            }
            None => models.push((model, vec![id], vec![finding])),
        }
    }
    models.into_iter().filter_map(|(_, ids, list)| folded(evidence, list, &ids)).collect()
}

/// Volts.
const LEAST: f64 = 0.05;
