//! An expression that has no value, or one beyond all numbers. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "expression-without-value",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an expression that has no value, or one beyond all numbers",
    why: "The square root of a negative number, the logarithm of zero: what it stands for is not evaluated.",
    remedy: "Look at the values that go in.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {sqrt(level)}\n\
              .param level=-4\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {sqrt(level)}\n\
              .param level=4\n\
              .end\n",
    check: Check::Reading,
};
