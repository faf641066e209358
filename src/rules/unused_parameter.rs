//! A parameter that nothing uses. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unused-parameter",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "a parameter that nothing uses",
    why: "Often the name is misspelt where it should be used.",
    remedy: "Remove it or correct the name.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .param load=1k\n\
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
