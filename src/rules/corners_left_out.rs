//! More ranges than can be examined in all combinations. Found where conditions and drops are laid out.

use super::{Check, Group, Rule};
use crate::finding::Severity;

/// The rule.
pub const RULE: Rule = Rule {
    name: "corners-left-out",
    group: Group::Notes,
    severity: Severity::Note,
    also: None,
    summary: "more ranges than can be examined in all combinations",
    why: "Seven ranges have 128 corners; beyond 64 each end is examined alone, so a state that only a combination brings about is not seen.",
    remedy: "Keep ranges of what matters together.",
    source: None,
    failing: "tide gauge buoy: sensor ladder\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              R2 a b 1k\n\
              R3 b c 1k\n\
              R4 c d 1k\n\
              R5 d e 1k\n\
              R6 e f 1k\n\
              D1 f 0 DX\n\
              .model DX D\n\
              *@ range R1 900 1100\n\
              *@ range R2 900 1100\n\
              *@ range R3 900 1100\n\
              *@ range R4 900 1100\n\
              *@ range R5 900 1100\n\
              *@ range R6 900 1100\n\
              *@ range V1 4 6\n\
              .end\n",
    passing: "tide gauge buoy: sensor ladder\n\
              V1 in 0 5\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n\
              *@ range V1 4 6\n\
              *@ range R1 900 1100\n\
              .end\n",
    check: Check::Reading,
};
