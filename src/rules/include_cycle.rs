//! A file that includes itself, directly or through others. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "include-cycle",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a file that includes itself, directly or through others",
    why: "It would be read without end.",
    remedy: "Remove one of the include lines.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .include include-cycle-failing.cir\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
