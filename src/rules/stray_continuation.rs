//! A `+` line with nothing above it to continue. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "stray-continuation",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "a `+` line with nothing above it to continue",
    why: "What stands on such a line is lost.",
    remedy: "Put it behind the statement that it belongs to.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              + of the northern buoy\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
