//! A subcircuit that holds an instance of itself. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "recursive-subcircuit",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a subcircuit that holds an instance of itself",
    why: "It would be expanded without end.",
    remedy: "Remove the inner instance.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP\n\
              .subckt LAMP p n\n\
              R1 p n 1k\n\
              X1 p n LAMP\n\
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
