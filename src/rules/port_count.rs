//! An instance with more or fewer nodes than its subcircuit has ports. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "port-count",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an instance with more or fewer nodes than its subcircuit has ports",
    why: "Which node belongs to which port cannot be known, so the instance is not expanded.",
    remedy: "Give one node for each port, in the order of the definition.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 a LAMP\n\
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
              X1 in 0 LAMP\n\
              .subckt LAMP p n\n\
              R1 p m 1k\n\
              D1 m n DX\n\
              .ends\n\
              .end\n",
    check: Check::Reading,
};
