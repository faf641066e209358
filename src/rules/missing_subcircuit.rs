//! An instance of a subcircuit that is defined nowhere. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "missing-subcircuit",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an instance of a subcircuit that is defined nowhere",
    why: "What is inside cannot be examined. The instance stays on its nodes as an unknown element.",
    remedy: "Add the definition, or include the file that holds it.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP\n\
              .subckt LAMP p n\n\
              R1 p m 1k\n\
              D1 m n DX\n\
              .ends\n\
              .end\n",
    check: Check::Reading,
};
