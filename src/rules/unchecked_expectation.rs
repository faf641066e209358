//! An `expect` note that could not be checked.

use super::{Check, Evidence, Group, Outcome, Rivals, Rule, claims};
use crate::finding::{Finding, Severity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "unchecked-expectation",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "an `expect` note could not be checked",
    why: "Whoever wrote it relies on it, and nothing here shows whether it holds.",
    remedy: "Correct the condition it names, or say with a `hold`, `supply` or `made-of` note what is missing.",
    source: None,
    failing: "tide gauge buoy: reverse protection\n\
              VBATT batt 0 12.6\n\
              D1 batt bus DSCHOT\n\
              R1 bus 0 120\n\
              *@ made-of DSCHOT schottky\n\
              *@ range VBATT 10.5 14.6\n\
              *@ expect D1 conducting at VBATT=10\n\
              .model DSCHOT D\n",
    passing: "tide gauge buoy: reverse protection\n\
              VBATT batt 0 12.6\n\
              D1 batt bus DSCHOT\n\
              R1 bus 0 120\n\
              *@ made-of DSCHOT schottky\n\
              *@ range VBATT 10.5 14.6\n\
              *@ expect D1 conducting at VBATT=10.5\n\
              .model DSCHOT D\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let (claims, _) = claims(evidence);
    let rivals = Rivals::of(&claims);
    let mut findings = Vec::new();
    for claim in claims.iter().filter(|c| !c.wanted.over_time) {
        let Outcome::Unchecked(why) = claim.judge(evidence, operating, &rivals) else { continue };
        let subject = claim.subject(evidence);
        let message = format!("what is expected of {subject} could not be checked: {why}");
        findings.push(
            evidence
                .at(&RULE, claim.note.scope, claim.note.span, message)
                .label("not checked")
                .about(subject)
                .help(format!("{} {}", RULE.why, RULE.remedy)),
        );
    }
    findings
}
