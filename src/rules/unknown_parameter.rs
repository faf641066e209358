//! An expression uses a parameter or function that is not known. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-parameter",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an expression uses a parameter or function that is not known",
    why: "What it stands for is not evaluated.",
    remedy: "Define it with `.param`, or correct the name.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {load}\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {load}\n\
              .param load=1k\n\
              .end\n",
    check: Check::Reading,
};
