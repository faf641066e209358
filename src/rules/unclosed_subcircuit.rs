//! A `.subckt` without its `.ends`. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unclosed-subcircuit",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a `.subckt` without its `.ends`",
    why: "All lines behind it count as its inside, and are missing from the circuit.",
    remedy: "Put `.ends` where the definition should end.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP\n\
              .subckt LAMP p n\n\
              R1 p m 1k\n\
              D1 m n DX\n\
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
