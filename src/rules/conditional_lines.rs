//! Lines that hang on a condition. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "conditional-lines",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "lines that hang on a condition are not read",
    why: "Conditions are not decided here, so the elements and values between `.if` and `.endif` are missing from the circuit, and whatever is said about it is said without them.",
    remedy: "Take the lines that hold out of the condition, or choose them by an include.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .if rev==2\n\
              R2 in 0 10k\n\
              .endif\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 10k\n\
              .end\n",
    check: Check::Reading,
};
