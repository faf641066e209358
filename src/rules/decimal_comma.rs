//! A number with a decimal comma. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "decimal-comma",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a number with a decimal comma",
    why: "A comma separates words: `0,1u` is the number 0 and the word 1u to most readers, so the part gets another value than its writer meant. It is read here as meant.",
    remedy: "Write a decimal point.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              C1 a 0 0,1u\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              C1 a 0 0.1u\n\
              .end\n",
    check: Check::Reading,
};
