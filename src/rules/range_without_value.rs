//! A range on a source that moves over time and has no DC value. Found where conditions and drops are laid out.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "range-without-value",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "a range on a source that moves over time and has no DC value",
    why: "A range replaces a DC value. Without one there is nothing to replace, and the source's extreme instants are examined anyway.",
    remedy: "Give the source a DC value beside its shape, or leave the range out.",
    source: None,
    failing: "tide gauge buoy: sonar envelope detector\n\
              V1 in 0 SIN(0 5 50)\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ range V1 3 6\n\
              .end\n",
    passing: "tide gauge buoy: sonar envelope detector\n\
              V1 in 0 DC 5 SIN(0 5 50)\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ range V1 3 6\n\
              .end\n",
    check: Check::Reading,
};
