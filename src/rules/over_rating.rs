//! Currents, reverse voltages and powers beyond what `rating` notes allow.

use super::support::Limit;
use super::{Check, Evidence, Group, Rule, in_cases};
use crate::circuit::{Behaviour, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{Case, Operating};
use rustc_hash::FxHashMap;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "over-rating",
    group: Group::States,
    severity: Severity::Warning,
    also: None,
    summary: "a current, a reverse voltage or a power exceeds the rating that a note gives",
    why: "A part beyond its rating fails early or at once.",
    remedy: "Take a part of a higher rating, or change what loads it; if the rating in the note is wrong, correct it.",
    source: None,
    failing: "tide gauge buoy: beacon lamp\n\
              VBAT bat 0 12\n\
              R1 bat lamp 100\n\
              D1 lamp 0 DWHITE\n\
              *@ rating D1 i=30m\n\
              .model DWHITE D(IS=1e-26 N=2)\n",
    passing: "tide gauge buoy: beacon lamp\n\
              VBAT bat 0 12\n\
              R1 bat lamp 470\n\
              D1 lamp 0 DWHITE\n\
              *@ rating D1 i=30m\n\
              .model DWHITE D(IS=1e-26 N=2)\n",
    check: Check::States(check),
};

/// A rating that is met exactly is no rating passed.
pub(super) const BEYOND: f64 = 1.0 + 1e-9;

/// What one element has to bear in one condition.
#[derive(Default, Clone, Copy)]
struct Load {
    current: Option<f64>,
    reverse: Option<f64>,
    power: Option<f64>,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let rated = evidence.ratings();
    if rated.is_empty() {
        return Vec::new();
    }
    let branches = operating.cases.iter().map(branches).collect::<Vec<_>>();
    let mut findings = Vec::new();
    for (&id, limits) in rated {
        let load = |(n, case)| (n, load(evidence, case, &branches[n], id));
        let loads: Vec<(usize, Load)> = judging(operating, id).map(load).collect();
        findings.extend(limits.iter().filter_map(|limit| judge(evidence, operating, limit, id, &loads)));
    }
    findings
}

/// Conditions that judge the element; an instant does not judge what is left to time.
fn judging(operating: &Operating, id: ElementId) -> impl Iterator<Item = (usize, &Case)> {
    let timed = operating.left_to_time.binary_search(&id).is_ok();
    operating.cases.iter().enumerate().filter(move |(_, case)| !(case.instant && timed))
}

/// The greatest reverse voltage of a diode over the conditions that judge it; 0 where there is none.
pub(super) fn reverse_voltage(operating: &Operating, id: ElementId) -> f64 {
    let diode = |case: &Case| {
        let diodes = &case.solutions.first()?.diodes;
        diodes.binary_search_by_key(&id, |d| d.element).ok().and_then(|at| diodes[at].voltage.known())
    };
    judging(operating, id).filter_map(|(_, case)| diode(case)).fold(0.0, |most, v| (-v).max(most))
}

/// Currents of what is no diode, in one condition.
fn branches(case: &Case) -> FxHashMap<ElementId, f64> {
    let all = case.solutions.first().into_iter().flat_map(|s| &s.branches);
    all.filter_map(|b| Some((b.element, b.current.known()?))).collect()
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    rating: &Limit<'_>,
    id: ElementId,
    loads: &[(usize, Load)],
) -> Option<Finding> {
    let Limit { note, key, limit, .. } = *rating;
    let mut over: BTreeMap<usize, f64> = BTreeMap::new();
    for &(number, load) in loads {
        let value = match key {
            "i" => load.current,
            "vr" => load.reverse,
            "p" => load.power,
            _ => None,
        };
        if let Some(value) = value.filter(|v| *v > limit * BEYOND) {
            over.insert(number, value);
        }
    }
    let worst = over.values().copied().fold(0.0, f64::max);
    let cases: Vec<usize> = over.keys().copied().collect();
    if cases.is_empty() {
        return None;
    }
    let (what, unit) = match key {
        "i" => ("carries", "A"),
        "vr" => ("blocks", "V"),
        _ => ("dissipates", "W"),
    };
    let message = format!(
        "{} {what} {}{}, and its rating is {}",
        evidence.name(id),
        quantity(worst, unit),
        in_cases(operating, &cases),
        quantity(limit, unit)
    );
    let mut finding = evidence
        .about(&RULE, id, message)
        .label(format!("{:.2} times its rating", worst / limit))
        .also(note.span, "the rating")
        .help(format!("{} {}", RULE.why, RULE.remedy));
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding)
}

fn load(evidence: &Evidence<'_>, case: &Case, branches: &FxHashMap<ElementId, f64>, id: ElementId) -> Load {
    let Some(solution) = case.solutions.first() else { return Load::default() };
    if let Ok(at) = solution.diodes.binary_search_by_key(&id, |d| d.element) {
        let diode = &solution.diodes[at];
        let volts = diode.voltage.known();
        return Load {
            current: diode.current.known().map(f64::abs),
            reverse: volts.map(|v| (-v).max(0.0)),
            power: diode.power,
        };
    }
    let current = branches.get(&id).copied();
    let power = match evidence.circuit.element(id).behaviour {
        Behaviour::Resistor(ohms) => current.map(|i| i * i * ohms.number),
        _ => None,
    };
    Load { current: current.map(f64::abs), reverse: None, power }
}
