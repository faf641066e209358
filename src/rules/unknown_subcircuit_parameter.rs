//! An instance sets a parameter that its subcircuit does not have. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-subcircuit-parameter",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "an instance sets a parameter that its subcircuit does not have",
    why: "The setting has no effect, so the default stands.",
    remedy: "Correct the name, or declare the parameter on the `.subckt` line.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP ohm=2k\n\
              .subckt LAMP p n ohms=1k\n\
              R1 p m {ohms}\n\
              D1 m n DX\n\
              .ends\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              X1 in 0 LAMP ohms=2k\n\
              .subckt LAMP p n ohms=1k\n\
              R1 p m {ohms}\n\
              D1 m n DX\n\
              .ends\n\
              .end\n",
    check: Check::Reading,
};
