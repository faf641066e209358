//! Line 1 is taken as the title, yet reads as an element or a dot line. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "title-reads-as-element",
    group: Group::Reading,
    severity: Severity::Warning,
    also: None,
    summary: "line 1 is taken as the title, yet reads as an element or a dot line",
    why: "The first line of a netlist is its title, whatever it says. Many first elements are lost that way.",
    remedy: "Put a title line above it.",
    source: None,
    failing: "V9 in 0 5\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
