//! Conditions of both revisions that are the same, and what a diode does in one.

use super::matching::Pairs;
use crate::circuit::{Circuit, ElementId, State};
use crate::operating::{Case, DiodeResult, Operating, Quantity};
use std::collections::BTreeMap;

/// The same condition in both revisions.
#[derive(Clone, Copy)]
pub(super) struct Twin<'a> {
    pub old: &'a Case,
    pub new: &'a Case,
}

/// Conditions that both examine, in the order of the new, and those that one examines alone.
pub(super) struct Twins<'a> {
    pub both: Vec<Twin<'a>>,
    pub gone: Vec<&'a Case>,
    pub added: Vec<&'a Case>,
}

/// Matches conditions by name, sources under their new names.
pub(super) fn twins<'a>(
    old: (&Circuit, &'a Operating),
    new: (&Circuit, &'a Operating),
    pairs: &Pairs,
) -> Twins<'a> {
    let renamed: BTreeMap<String, String> = pairs
        .elements
        .iter()
        .filter(|p| p.renamed)
        .map(|p| (old.0.element_name(p.old).to_lowercase(), new.0.element_name(p.new).to_lowercase()))
        .collect();
    let mut before: BTreeMap<String, &Case> =
        old.1.cases.iter().map(|case| (translated(&case.name, &renamed), case)).collect();
    let (mut both, mut added) = (Vec::new(), Vec::new());
    for case in &new.1.cases {
        match before.remove(&translated(&case.name, &BTreeMap::new())) {
            Some(old) => both.push(Twin { old, new: case }),
            None => added.push(case),
        }
    }
    let gone = old.1.cases.iter().filter(|c| before.values().any(|left| std::ptr::eq(*left, *c))).collect();
    Twins { both, gone, added }
}

fn translated(name: &str, renamed: &BTreeMap<String, String>) -> String {
    let part = |part: &str| match part.split_once('=') {
        Some((key, value)) => {
            let key = key.to_lowercase();
            format!("{}={}", renamed.get(&key).unwrap_or(&key), value.to_lowercase())
        }
        None => part.to_lowercase(),
    };
    name.split(',').map(part).collect::<Vec<_>>().join(",")
}

/// A diode in one condition: its state where all consistent sets agree on it, and one of its results.
pub(super) fn seen<'a>(
    operating: &Operating,
    case: &'a Case,
    id: ElementId,
) -> Option<(Option<State>, &'a DiodeResult)> {
    if case.instant && operating.left_to_time.binary_search(&id).is_ok() {
        return None;
    }
    let mut all = case.solutions.iter().filter_map(|s| {
        let at = s.diodes.binary_search_by_key(&id, |d| d.element).ok()?;
        s.diodes.get(at)
    });
    let first = all.next()?;
    let agreed = all.all(|other| other.state == first.state);
    Some((agreed.then_some(first.state), first))
}

/// The current where it is settled, and the only one.
pub(super) fn current(case: &Case, diode: &DiodeResult) -> Option<f64> {
    match diode.current {
        Quantity::Known(current) if case.solutions.len() == 1 => Some(current + 0.0),
        _ => None,
    }
}
