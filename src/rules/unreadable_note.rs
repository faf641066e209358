//! A note that cannot be read. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unreadable-note",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "a note that cannot be read",
    why: "It has no effect.",
    remedy: "Correct its first word or its shape.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drpo D1 0.65\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drop D1 0.65\n\
              .end\n",
    check: Check::Reading,
};
