//! An expression divides by zero. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "division-by-zero",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an expression divides by zero",
    why: "What it stands for is not evaluated.",
    remedy: "Correct the parameter that is zero.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {1k/turns}\n\
              .param turns=0\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {1k/turns}\n\
              .param turns=2\n\
              .end\n",
    check: Check::Reading,
};
