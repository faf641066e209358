//! An element names another that is not there. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "missing-element",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an element names another that is not there",
    why: "A controlled source without its control, or a coupling without its coils, means nothing.",
    remedy: "Correct the name.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              F1 in 0 V7 2\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              F1 in 0 V1 2\n\
              .end\n",
    check: Check::Reading,
};
