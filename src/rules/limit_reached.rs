//! A circuit, file, statement or expression that is too large or too deep. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "limit-reached",
    group: Group::Reading,
    severity: Severity::Error,
    also: Some(Severity::Note),
    summary: "a circuit, file, statement or expression that is too large or too deep",
    why: "A few lines can ask for a billion elements. Reading stops at a stated bound, so that nothing hangs, and what is beyond counts as unknown.",
    remedy: "Check the parts one by one.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((((1k))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))))}\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {(1k)}\n\
              .end\n",
    check: Check::Reading,
};
