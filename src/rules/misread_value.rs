//! A value whose last letter means something else than it seems to. Found while reading.

use super::{Check, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "misread-value",
    group: "reading",
    severity: Severity::Warning,
    also: None,
    summary: "a value whose last letter means something else than it seems to",
    why: "Scale letters are case-blind: `1M` is a thousandth and `1F` is a femto. A resistor of 1 MΩ becomes one of 1 mΩ, which shorts what it should barely load.",
    remedy: "Write `Meg` for a million; give farads without a letter.",
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
