//! A model of another type than the element's letter takes. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "wrong-model-type",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "a model of another type than the element's letter takes",
    why: "The element counts as having no model.",
    remedy: "Correct the model's name or its type.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              D2 0 in QX\n\
              .model QX NPN\n\
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
