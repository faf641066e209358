//! A model that is named and defined nowhere. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "undefined-model",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "a model that is named and defined nowhere",
    why: "Nothing is known about the part. A diode counts as silicon with the default drop, and trust in it is at best fair.",
    remedy: "Add the `.model` line, or include the file that holds it.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              D2 0 in DSIGN\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              D2 0 in DX\n\
              .end\n",
    check: Check::Reading,
};
