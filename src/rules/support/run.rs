//! Runs every rule whose evidence is there.

use super::rule::{Check, Skipped};
use super::{Evidence, accept, consequences, instances};
use crate::finding::{Finding, Severity, set_levels};
use crate::operating::Operating;
use crate::swing::Swing;
use std::collections::BTreeMap;

/// All findings of all rules as they come, and those that could not judge, with the reason. Findings of reading are not among
/// them: they were made by `circuit::read`, and are given as `reading` so that one cause is told once.
pub fn run(
    evidence: &mut Evidence<'_>,
    reading: &[Finding],
    operating: Option<&Operating>,
    swing: Option<&Swing>,
    levels: &BTreeMap<String, Option<Severity>>,
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
    // what is accepted or switched off has told nobody its consequences
    accept::accept(evidence, &mut told, |_| false);
    told.retain(|finding| finding.accepted.is_none());
    set_levels(&mut told, levels);
    evidence.keep_told(told);
    if let Some(swing) = swing {
        evidence.keep_time(swing);
    }
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
    (findings, skipped)
}

/// What is shown: all findings with `accept` notes and levels applied, and of what is left one finding for each cause
/// and each definition. `judged` come from [`run`], `reading` from the stages before it.
pub fn settle(
    evidence: &Evidence<'_>,
    reading: Vec<Finding>,
    judged: Vec<Finding>,
    skipped: &[Skipped],
    levels: &BTreeMap<String, Option<Severity>>,
) -> Vec<Finding> {
    let mut findings = reading;
    let before = findings.len();
    findings.extend(judged);
    let about_accepts =
        accept::accept(evidence, &mut findings, |rule| !skipped.iter().any(|s| s.rule == rule));
    let mut judged = findings.split_off(before);
    findings.extend(about_accepts);
    set_levels(&mut findings, levels);
    set_levels(&mut judged, levels);
    consequences::fold(&mut judged);
    findings.extend(instances::fold(evidence.circuit, judged));
    findings
}
