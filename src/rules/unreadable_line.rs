//! A line, or a part of it, that cannot be read. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unreadable-line",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a line, or a part of it, that cannot be read",
    why: "An element without its nodes or its value cannot be examined. The next line is read all the same, and the element stays on its nodes as an unknown one, so that it causes no false alarm there.",
    remedy: "Complete or mend the line; a comment begins with `*`.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 a 0\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 a 0 10k\n\
              .end\n",
    check: Check::Reading,
};
