//! Results that do not satisfy the circuit's laws when put back into them.

use super::{Check, Evidence, Group, Rule, causes};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "unverified-result",
    group: Group::States,
    severity: Severity::Error,
    also: None,
    summary: "a result does not satisfy the circuit's laws when it is put back into them, so it is not given",
    why: "Values that differ by more than double precision can hold leave a residual beyond 1e-9 of the largest \
          term; an answer that cannot be proved is not printed.",
    remedy: "Look for values that are off by orders of magnitude (a missing `meg`, a resistance of 1e-15 Ω); take \
             elements out that stand for nothing but a short or an open circuit.",
    source: None,
    failing: "tide gauge buoy: a model with its series resistance mistyped\n\
              VBAT bat 0 12\n\
              R1 bat a 1k\n\
              D1 a 0 DRECT\n\
              .model DRECT D(IS=2.5n N=1.7 RS=1e-300)\n",
    passing: "tide gauge buoy: a model with its series resistance\n\
              VBAT bat 0 12\n\
              R1 bat a 1k\n\
              D1 a 0 DRECT\n\
              .model DRECT D(IS=2.5n N=1.7 RS=30m)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::Unverified)
        .iter()
        .map(|c| super::support::finding(&RULE, evidence, operating, c, "in this part"))
        .collect()
}
