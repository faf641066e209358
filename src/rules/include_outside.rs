//! An included file lies where nothing may be opened. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "include-outside",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an included file lies where nothing may be opened",
    why: "A netlist from elsewhere could otherwise have any file of the machine read. Only files of its own repository or directory are opened.",
    remedy: "Name the place with `--include-dir` if it is to be trusted.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .include ../../elsewhere/diodes.inc\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
