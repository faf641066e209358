//! An expression that cannot be read. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unreadable-expression",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an expression that cannot be read",
    why: "What it stands for is not evaluated.",
    remedy: "Mend the expression.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {2*(1k}\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {2*(1k)}\n\
              .end\n",
    check: Check::Reading,
};
