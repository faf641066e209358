//! Runs every rule whose evidence is there.

use super::Evidence;
use super::instances;
use super::rule::{Check, Skipped};
use crate::finding::Finding;
use crate::operating::Operating;

/// All findings of all rules, and those that could not judge, with the reason. Findings of reading are not among
/// them: they were made by `circuit::read`.
pub fn run(evidence: &Evidence<'_>, operating: Option<&Operating>) -> (Vec<Finding>, Vec<Skipped>) {
    let mut findings = Vec::new();
    let mut skipped = Vec::new();
    for rule in super::super::all() {
        match (&rule.check, operating) {
            (Check::Reading | Check::Notes, _) => {}
            (Check::Wiring(check), _) => findings.extend(check(evidence)),
            (Check::States(check), Some(states)) => findings.extend(check(evidence, states)),
            (Check::States(_), None) => skipped.push(Skipped {
                rule: rule.name,
                reason: "needs the states of the diodes, which this run does not look for".into(),
            }),
        }
    }
    (instances::fold(evidence.circuit, findings), skipped)
}
