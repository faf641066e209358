//! Nodes whose voltage the model leaves open.

use super::{Check, Evidence, Rule, causes};
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "open-potential",
    group: "states",
    severity: Severity::Note,
    summary: "a node's voltage is left open, since only blocking diodes and current sources lead to it",
    why: "No current flows there whatever the voltage is, within the limits that keep the diodes blocking. \
          Leakage decides in the real circuit; the table prints the interval.",
    remedy: "Where the voltage matters, hold the node by a resistance.",
    source: Some(
        "Sets of nodes that only open branches and current sources leave have no determined \
                  potential: Chua, Desoer & Kuh, Linear and Nonlinear Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: input clamp with nothing driving it\n\
              VCC vcc 0 3.3\n\
              D1 in vcc DSW\n\
              D2 0 in DSW\n\
              C1 in 0 1n\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: input clamp with a pull-down\n\
              VCC vcc 0 3.3\n\
              D1 in vcc DSW\n\
              D2 0 in DSW\n\
              C1 in 0 1n\n\
              R1 in 0 100k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(operating, Verdict::Floating)
        .iter()
        .filter(|c| !super::is_told(evidence, &c.contradiction.elements))
        .filter_map(|c| {
            let any = !c.contradiction.elements.is_empty();
            any.then(|| super::support::contradiction(&RULE, evidence, operating, c, "leads to it"))
        })
        .collect()
}
