//! Results of diodes gathered over the conditions, for rules that ask how far they may be believed.

use super::Evidence;
use crate::circuit::ElementId;
use crate::finding::Finding;
use crate::operating::{DiodeResult, Operating};

/// A diode in one condition: the condition's number and the result.
pub type In<'o> = (usize, &'o DiodeResult);

/// Each diode with its results in all conditions that have one answer and judge it, in the order of the text.
pub fn by_diode(operating: &Operating) -> Vec<(ElementId, Vec<In<'_>>)> {
    let mut list: Vec<(ElementId, Vec<In<'_>>)> = Vec::new();
    for (number, case) in operating.cases.iter().enumerate() {
        let [solution] = &case.solutions[..] else { continue };
        for (at, diode) in solution.diodes.iter().enumerate() {
            if case.instant && operating.left_to_time.binary_search(&diode.element).is_ok() {
                continue;
            }
            // the lists of all conditions are alike, so the place is nearly always the same
            let place = match list.get(at) {
                Some((id, _)) if *id == diode.element => Ok(at),
                _ => list.binary_search_by_key(&diode.element, |(id, _)| *id),
            };
            match place {
                Ok(at) => list[at].1.push((number, diode)),
                Err(at) => list.insert(at, (diode.element, vec![(number, diode)])),
            }
        }
    }
    list
}

/// ` (in VIN=9)`; nothing where there is only one condition.
pub fn in_case(operating: &Operating, number: usize) -> String {
    match operating.cases.get(number) {
        Some(case) if operating.cases.len() > 1 => format!(" (in {})", case.name),
        _ => String::new(),
    }
}

/// One finding of several that have one cause: the first speaks, the others are marked and named.
pub fn folded(evidence: &Evidence<'_>, mut findings: Vec<Finding>, ids: &[ElementId]) -> Option<Finding> {
    let others = findings.split_off(1.min(findings.len()));
    let mut first = findings.pop()?;
    for (other, &id) in others.iter().zip(ids.iter().skip(1)) {
        if first.labels.len() < 8 {
            first = first.also(evidence.statement(id), format!("{} alike", evidence.name(id)));
        }
        first.severity = first.severity.max(other.severity);
        first.subjects.push(evidence.name(id));
    }
    if !others.is_empty() {
        let names: Vec<String> = ids.iter().skip(1).map(|&id| evidence.name(id)).collect();
        first.message = format!("{}; so with {}", first.message, super::list(&names));
    }
    Some(first)
}
