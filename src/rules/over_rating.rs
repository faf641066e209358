//! Currents, reverse voltages and powers beyond what `rating` notes allow.

use super::{Check, Evidence, Rule, in_cases};
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, ElementId, Note, NoteKind};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{Case, Operating};
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "over-rating",
    group: "states",
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

/// What one element has to bear in one condition.
#[derive(Default, Clone, Copy)]
struct Load {
    current: Option<f64>,
    reverse: Option<f64>,
    power: Option<f64>,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let is_rating = |n: &&Note| matches!(n.kind, NoteKind::Rating(_));
    let notes: Vec<&Note> = circuit.notes.iter().filter(is_rating).collect();
    if notes.is_empty() {
        return Vec::new();
    }
    let directory = Directory::of(circuit);
    let mut findings = Vec::new();
    for note in notes {
        let NoteKind::Rating(limits) = &note.kind else { continue };
        for id in rated(evidence, &directory, note) {
            for (key, limit) in limits {
                findings.extend(judge(evidence, operating, note, id, key, *limit));
            }
        }
    }
    findings
}

/// The element that a note names, or all diodes of the model that it names.
fn rated(evidence: &Evidence<'_>, directory: &Directory, note: &Note) -> Vec<ElementId> {
    let name = evidence.circuit.text(note.subject);
    if let Some(id) = directory.element(note.scope, name) {
        return vec![id];
    }
    let is_named = |id: &ElementId| evidence.model_name(*id).is_some_and(|m| m.eq_ignore_ascii_case(name));
    evidence.circuit.elements().map(|(id, _)| id).filter(is_named).collect()
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    note: &Note,
    id: ElementId,
    key: &str,
    limit: f64,
) -> Option<Finding> {
    let mut over: BTreeMap<usize, f64> = BTreeMap::new();
    for (number, case) in operating.cases.iter().enumerate() {
        if case.instant && operating.left_to_time.binary_search(&id).is_ok() {
            continue;
        }
        let load = load(evidence, case, id);
        let value = match key {
            "i" => load.current,
            "vr" => load.reverse,
            "p" => load.power,
            _ => None,
        };
        if let Some(value) = value.filter(|v| *v > limit * (1.0 + 1e-9)) {
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

fn load(evidence: &Evidence<'_>, case: &Case, id: ElementId) -> Load {
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
    let current = solution.branches.iter().find(|b| b.element == id).and_then(|b| b.current.known());
    let power = match evidence.circuit.element(id).behaviour {
        Behaviour::Resistor(ohms) => current.map(|i| i * i * ohms.number),
        _ => None,
    };
    Load { current: current.map(f64::abs), reverse: None, power }
}
