//! A port that nothing inside its subcircuit touches. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unconnected-port",
    group: Group::Reading,
    severity: Severity::Note,
    also: None,
    summary: "a port that nothing inside its subcircuit touches",
    why: "An outside node that ends at it is joined to nothing.",
    remedy: "Remove the port, or look whether a node inside is misspelt.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 a LAMP\n\
              .subckt LAMP p n spare\n\
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
