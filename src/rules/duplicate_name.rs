//! Two elements or two instances of one name. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "duplicate-name",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "two elements or two instances of one name",
    why: "Results and notes go by names, and other tools refuse such a file or drop one of the two.",
    remedy: "Rename one of them.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R1 in 0 10k\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 10k\n\
              .end\n",
    check: Check::Reading,
};
