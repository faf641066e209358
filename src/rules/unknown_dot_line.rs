//! A dot line that means nothing here. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-dot-line",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "a dot line that means nothing here",
    why: "If it was meant for another tool nothing is wrong; if it is misspelt it has no effect.",
    remedy: "Correct the word.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .tmep 50\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .temp 50\n\
              .end\n",
    check: Check::Reading,
};
