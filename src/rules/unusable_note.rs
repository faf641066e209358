//! A note that cannot apply to what it names. Found where conditions and drops are laid out.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unusable-note",
    group: Group::Notes,
    severity: Severity::Warning,
    also: Some(Severity::Error),
    summary: "a note that cannot apply to what it names",
    why: "A drop below zero, a material that is not in the table, a `hold` on something that has no main path, a supply for a node that the netlist already holds: the note is not used.",
    remedy: "Correct the note or remove it.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ hold R1 on\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ made-of DX schottky\n\
              .end\n",
    check: Check::Reading,
};
