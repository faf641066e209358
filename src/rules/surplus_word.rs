//! Words on an element's line that mean nothing there. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "surplus-word",
    group: Group::Reading,
    severity: Severity::Warning,
    also: Some(Severity::Note),
    summary: "words behind a complete element",
    why: "They are not read. Most often they belong to the next statement, whose line end is missing, or continue a line that was commented out: then an element is lost without a word.",
    remedy: "Give them a line of their own, mend the line they continue, or put `;` before a comment.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 10k R3 in a 2k\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 10k ; with R3\n\
              .end\n",
    check: Check::Reading,
};
