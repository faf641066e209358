//! Results that do not satisfy the circuit's laws when put back into them.

use super::{Check, Evidence, Rule, causes};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "unverified-result",
    group: "states",
    severity: Severity::Error,
    summary: "a result does not satisfy the circuit's laws when it is put back into them, so it is not given",
    why: "Values that differ by more than double precision can hold leave a residual beyond 1e-9 of the largest \
          term; an answer that cannot be proved is not printed.",
    remedy: "Look for values that are off by orders of magnitude (a missing `meg`, a resistance of 1e-15 Ω); take \
             elements out that stand for nothing but a short or an open circuit.",
    source: None,
    failing: "tide gauge buoy: a shunt of next to nothing\n\
              VBAT bat 0 12\n\
              R1 bat a 1e12\n\
              R2 a b 1e-300\n\
              E1 c 0 b a 1e300\n\
              R3 c b 1\n\
              R4 b 0 1\n",
    passing: "tide gauge buoy: a shunt\n\
              VBAT bat 0 12\n\
              R1 bat a 10\n\
              R2 a 0 0.01\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::Unverified)
        .iter()
        .map(|c| super::support::contradiction(&RULE, evidence, operating, c, "in this part"))
        .collect()
}
