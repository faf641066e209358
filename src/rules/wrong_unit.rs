//! A value in the unit of another quantity. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "wrong-unit",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "a value in the unit of another quantity",
    why: "Unit letters are ignored, so a resistor of `10uF` is one of 10 µΩ. Most likely the letter at the head of the line is wrong, or the value belongs to another line.",
    remedy: "Correct the value or the element's letter.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 10uF\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              C2 in 0 10uF\n\
              .end\n",
    check: Check::Reading,
};
