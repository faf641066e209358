//! A note, `.dc` line or option names nothing in this circuit. Found where conditions and drops are laid out.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "unknown-name",
    group: Group::Notes,
    severity: Severity::Warning,
    also: Some(Severity::Error),
    summary: "a note, `.dc` line or option names nothing in this circuit",
    why: "What it says has no effect, so the states are not those that its writer expects.",
    remedy: "Correct the name; inside an instance write the path, such as `X1:D3`.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drop D7 0.65\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ drop D1 0.65\n\
              .end\n",
    check: Check::Reading,
};
