//! Circuits with more than one consistent set of states.

use super::{Check, Evidence, Group, Rule, causes};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "several-states",
    group: Group::States,
    severity: Severity::Note,
    also: None,
    summary: "more than one set of states satisfies the circuit's laws",
    why: "Feedback through a controlled source, or a negative resistance, makes the circuit remember: which set \
          holds depends on how it was switched on. All sets are listed.",
    remedy: "If it is meant as a latch or an oscillator, all is well; if not, look at the sense of the feedback.",
    source: Some(
        "Only a complementarity matrix of class P gives one solution for every source value: Cottle, \
                  Pang & Stone, The Linear Complementarity Problem, 1992",
    ),
    failing: "tide gauge buoy: latch of the hatch switch\n\
              E1 e 0 a 0 3\n\
              R1 e a 1k\n\
              V1 lim 0 2\n\
              D1 a lim DSW\n\
              D2 neg a DSW\n\
              V2 0 neg 2\n\
              R2 a 0 1k\n\
              .model DSW D(IS=2.5n N=1.75 RS=10)\n",
    passing: "tide gauge buoy: no latch\n\
              E1 e 0 a 0 0.5\n\
              R1 e a 1k\n\
              V1 lim 0 2\n\
              D1 a lim DSW\n\
              R2 a lim 1k\n\
              .model DSW D(IS=2.5n N=1.75 RS=10)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::Several)
        .iter()
        .map(|c| super::support::finding(&RULE, evidence, operating, c, "takes part"))
        .collect()
}
