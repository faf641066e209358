//! Currents that hang on a small rest of the supply.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{ElementId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, Operating, Trust};

pub const RULE: Rule = Rule {
    name: "small-headroom",
    group: Group::Trust,
    severity: Severity::Note,
    also: None,
    summary: "the voltage left over for a current is small against the uncertainty of the drops in its path",
    why: "A current set by a supply minus drops is off by the error of the drops over what is left of the supply: with 0.3 V left, 0.1 V is a third of it.",
    remedy: "Leave more headroom, or set the current by a source that does not hang on the drops.",
    source: Some("dI/I = dV/(V - V_on), the constant drop against the exponential law"),
    failing: "tide gauge buoy: beacon from a weak cell\n\
              *@ made-of D1 red-led\n\
              VB bat 0 2.1\n\
              R1 bat a 22\n\
              D1 a 0 DRED\n\
              .model DRED D\n",
    passing: "tide gauge buoy: beacon from two cells\n\
              *@ made-of D1 red-led\n\
              VB bat 0 9\n\
              R1 bat a 680\n\
              D1 a 0 DRED\n\
              .model DRED D\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    // one cause, one finding: currents are gathered under the diode whose drop matters most to them
    let mut causes: Vec<(ElementId, Vec<(usize, &DiodeResult)>)> = Vec::new();
    for (_, results) in by_diode(operating) {
        let Some(&(number, diode)) = results.iter().find(|(_, d)| is_small(d)) else { continue };
        let cause = diode.error.and_then(|e| e.most).map_or(diode.element, |(id, _)| id);
        match causes.iter_mut().find(|(id, _)| *id == cause) {
            Some((_, list)) => list.push((number, diode)),
            None => causes.push((cause, vec![(number, diode)])),
        }
    }
    causes.iter().filter_map(|(id, list)| finding(evidence, operating, *id, list)).collect()
}

/// Conducting, off by more than a fifth, and not for being decades from its drop's current.
fn is_small(diode: &DiodeResult) -> bool {
    let near = diode
        .knee
        .zip(diode.current.known())
        .is_some_and(|(k, i)| i > 0.0 && k.reference > 0.0 && (i / k.reference).log10().abs() <= 1.0);
    diode.state == State::Conducting && diode.trust == Some(Trust::Poor) && near && diode.view.is_some()
}

fn finding(
    evidence: &Evidence<'_>,
    operating: &Operating,
    cause: ElementId,
    list: &[(usize, &DiodeResult)],
) -> Option<Finding> {
    let &(number, diode) = list.first()?;
    let (view, current, error) = (diode.view?, diode.current.known()?, diode.error?);
    let left = quantity((view.open_circuit - diode.drop.volts).abs(), "V");
    let name = evidence.name(diode.element);
    let whose = if cause == diode.element {
        let drop = quantity(diode.drop.volts, "V");
        let knee = diode.knee?;
        format!("its drop of {drop} is known to {} only", quantity(knee.uncertainty, "V"))
    } else {
        format!("the drops in its path, first of all that of {}, are known no better", evidence.name(cause))
    };
    let all =
        if error.most.is_some_and(|(_, part)| error.current > 1.25 * part) { "with all drops " } else { "" };
    let message = format!(
        "{name} sees only {left} more than its drop, and {whose}: {all}its {} may be off by {:.0} %{}",
        quantity(current, "A"),
        (100.0 * error.current / current).min(999.0),
        in_case(operating, number)
    );
    let mut finding =
        evidence.about(&RULE, diode.element, message).label("little is left over for its current");
    for (_, other) in list.iter().skip(1) {
        if finding.labels.len() < 8 {
            finding = finding.also(evidence.statement(other.element), "hangs on the same drop");
        }
        finding.subjects.push(evidence.name(other.element));
    }
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
