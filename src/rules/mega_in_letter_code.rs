//! A value such as `4M7`, in which M is mega. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "mega-in-letter-code",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "a value such as `4M7`, in which M is mega",
    why: "In the letter code of IEC 60062 the letter stands at the decimal point and M is mega, whereas behind all digits it is milli. Other readers of netlists may take it otherwise.",
    remedy: "Write `4.7Meg` to leave no doubt.",
    source: Some("IEC 60062:2016, marking codes for resistors and capacitors (letter code from memory)"),
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 4M7\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 4k7\n\
              .end\n",
    check: Check::Reading,
};
