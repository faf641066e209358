//! Runs every rule whose evidence is there.

use super::rule::{Check, Skipped};
use super::{Evidence, consequences, instances};
use crate::finding::Finding;
use crate::operating::Operating;
use crate::swing::Swing;

/// All findings of all rules, and those that could not judge, with the reason. Findings of reading are not among
/// them: they were made by `circuit::read`, and are given as `reading` so that one cause is told once.
pub fn run(
    evidence: &mut Evidence<'_>,
    reading: &[Finding],
    operating: Option<&Operating>,
    swing: Option<&Swing>,
) -> (Vec<Finding>, Vec<Skipped>) {
    let mut told = Vec::new();
    let mut skipped = Vec::new();
    for rule in super::super::all() {
        match (&rule.check, operating) {
            (Check::Wiring(check), _) => told.extend(check(evidence)),
            (Check::States(_), None) => skipped.push(Skipped {
                rule: rule.name,
                reason: "needs the states of the diodes, which this run does not look for".into(),
            }),
            (Check::Time(_), _) if swing.is_none() => skipped.push(Skipped {
                rule: rule.name,
                reason: "needs what happens over time, which this run does not follow".into(),
            }),
            (Check::Reading | Check::Notes | Check::States(_) | Check::Time(_), _) => {}
        }
    }
    let mut findings = told.clone();
    told.extend(reading.iter().cloned());
    evidence.keep_told(told);
    let evidence = &*evidence;
    if let Some(states) = operating {
        for rule in super::super::all() {
            match (&rule.check, swing) {
                (Check::States(check), _) => findings.extend(check(evidence, states)),
                (Check::Time(check), Some(swing)) => findings.extend(check(evidence, states, swing)),
                _ => {}
            }
        }
    }
    consequences::fold(&mut findings);
    (instances::fold(evidence.circuit, findings), skipped)
}
