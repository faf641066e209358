//! Currents whose split the model leaves open.

use super::{Check, Evidence, Rule, causes};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "open-split",
    group: "states",
    severity: Severity::Note,
    summary: "how a current splits between branches is left open by the constant-drop model",
    why: "Around the loop the drops and sources sum to exactly zero, so every split of the current satisfies the \
          laws. Real parts decide by their spread; the table prints the interval.",
    remedy: "Where the split matters, give each branch its own resistance, or look at it with the exponential \
             law.",
    source: Some(
        "Equal drops in parallel make the complementarity matrix semidefinite, not definite: Cottle, \
                  Pang & Stone, The Linear Complementarity Problem, 1992",
    ),
    failing: "tide gauge buoy: two detectors on one node\n\
              VIN in 0 5\n\
              R1 in out 1k\n\
              D1 out 0 DA\n\
              D2 out 0 DB\n\
              .model DA D(IS=2.5n N=1.75)\n\
              .model DB D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: two detectors on one node\n\
              VIN in 0 5\n\
              R1 in out1 1k\n\
              R2 in out2 1k\n\
              D1 out1 0 DA\n\
              D2 out2 0 DB\n\
              .model DA D(IS=2.5n N=1.75)\n\
              .model DB D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(operating, Verdict::Shared)
        .iter()
        .filter(|c| !super::is_told(evidence, &c.contradiction.elements))
        .map(|c| super::support::contradiction(&RULE, evidence, operating, c, "in the same loop"))
        .collect()
}
