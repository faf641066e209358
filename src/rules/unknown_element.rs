//! An element whose letter is not known here. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-element",
    group: Group::Reading,
    severity: Severity::Warning,
    also: Some(Severity::Note),
    summary: "an element whose letter is not known here",
    why: "Nothing can be said about what it does. It stays on its nodes as an unknown element.",
    remedy: "Begin prose with `*`; correct the letter of a misspelt element.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              Z1 in 0 0 MESFET\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
