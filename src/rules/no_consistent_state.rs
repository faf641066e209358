//! Contradictions that are neither a loop through diodes nor a blocked current: what controlled sources and
//! negative resistances bring about, and sources that contradict one another once the states are known.

use super::{Check, Evidence, Group, Rule, blocked_current, causes, is_told, unlimited_current};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "no-consistent-state",
    group: Group::States,
    severity: Severity::Error,
    also: None,
    summary: "no set of states satisfies the circuit's laws",
    why: "Whatever states are assumed, some law fails, so the circuit as written has no operating point: \
          sources contradict one another, or a controlled source drives itself without bound.",
    remedy: "Look at the gain and the sense of the controlled sources named, and at the sources that fix the \
             same voltage.",
    source: Some(
        "Uniqueness needs the complementarity matrix to be of class P: Cottle, Pang & Stone, The \
                  Linear Complementarity Problem, 1992",
    ),
    failing: "tide gauge buoy: comparator with its inputs crossed\n\
              VIN in 0 1\n\
              RIN in a 1k\n\
              E1 out 0 out a 1\n\
              ROUT out 0 1k\n\
              RA a 0 1k\n",
    passing: "tide gauge buoy: comparator with its inputs as they should be\n\
              VIN in 0 1\n\
              RIN in a 1k\n\
              E1 out 0 a out 100\n\
              ROUT out 0 1k\n\
              RA a 0 1k\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::None)
        .iter()
        .filter(|c| !unlimited_current::is_ours(evidence, c) && !blocked_current::is_ours(evidence, c))
        .filter(|c| !is_told(evidence, &c.cause.elements))
        .map(|c| super::support::finding(&RULE, evidence, operating, c, "takes part"))
        .collect()
}
