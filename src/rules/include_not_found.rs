//! An included file, or its section, is not there. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "include-not-found",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "an included file, or its section, is not there",
    why: "Models and subcircuits that it may define are missing; they are not reported one by one.",
    remedy: "Correct the path, or name the place with `--include-dir`.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .include diodes.inc\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              .end\n",
    check: Check::Reading,
};
