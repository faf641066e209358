//! A value whose letters mean something else than they seem to. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "misread-value",
    group: Group::Reading,
    severity: Severity::Warning,
    also: Some(Severity::Note),
    summary: "a value whose letters mean something else than they seem to",
    why: "Scale letters are case-blind: `1M` is a thousandth and `1F` is a femto. A resistor of 1 MΩ becomes one of 1 mΩ, which shorts what it should barely load. Letters behind a value and its scale are ignored as a unit is: `1O`, with the letter O, is one, and the last letter of `4k7k` means nothing.",
    remedy: "Write `Meg` for a million; give farads without a letter; use one scale letter and digits for digits.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 1M\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 1Meg\n\
              .end\n",
    check: Check::Reading,
};
