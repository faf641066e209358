//! A file without any element of its own. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "nothing-to-check",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "a file without any element of its own",
    why: "A library that only defines models and subcircuits is examined where a circuit uses it.",
    remedy: "Check the circuit that includes it.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              .subckt LAMP p n\n\
              R1 p m 1k\n\
              D1 m n DX\n\
              .ends\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
