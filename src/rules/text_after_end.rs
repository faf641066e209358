//! Statements behind `.end`. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "text-after-end",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "statements behind `.end`",
    why: "They are not read. A file that was put together from two has often lost its second half that way.",
    remedy: "Move them above `.end`, or remove them.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n\
              R2 in 0 1k\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
