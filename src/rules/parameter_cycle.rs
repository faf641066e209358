//! A parameter that needs its own value. Found while reading.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "parameter-cycle",
    group: Group::Reading,
    severity: Severity::Error,
    also: None,
    summary: "a parameter that needs its own value",
    why: "It has none, and nothing that uses it can be evaluated.",
    remedy: "Give one parameter of the circle a number.",
    source: None,
    failing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {load}\n\
              .param load={half*2} half={load/2}\n\
              .end\n",
    passing: "tide gauge buoy: beacon LED\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              R2 in 0 {load}\n\
              .param load={half*2} half=500\n\
              .end\n",
    check: Check::Reading,
};
