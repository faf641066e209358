//! Two different definitions of one model or subcircuit. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "defined-twice",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "two different definitions of one model or subcircuit",
    why: "Tools differ in which of the two they take, so the circuit means different things to different readers. The last one counts here.",
    remedy: "Rename or remove one.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .model DX D(IS=1n)\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .model DY D(IS=1n)\n\
              D2 a 0 DY\n\
              .end\n",
    check: Check::Reading,
};
