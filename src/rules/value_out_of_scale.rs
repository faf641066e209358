//! A value that no part has. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "value-out-of-scale",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "a value that no part has",
    why: "A capacitor of a million farads is a slip of the scale letter.",
    remedy: "Correct the scale letter.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              C1 in 0 1meg\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              C1 in 0 1u\n\
              .end\n",
    check: Check::Reading,
};
