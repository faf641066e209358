//! Two notes of one kind on one name and level. Found where conditions and drops are laid out.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "conflicting-notes",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "two notes of one kind on one name and level",
    why: "Only one of them can hold, and nobody can see which was meant.",
    remedy: "Keep one of them.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drop D1 0.65\n\
              *@ drop D1 0.7\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drop DX 0.65\n\
              *@ drop D1 0.7\n\
              .end\n",
    check: Check::Reading,
};
