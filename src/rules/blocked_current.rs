//! Current sources that drive against diodes which do not let the current pass.

use super::unlimited_current::is_current;
use super::{Check, Evidence, Group, Rule, Shown, causes, is_told};
use crate::circuit::Behaviour;
use crate::finding::{Finding, Severity};
use crate::operating::{Operating, Verdict};

pub const RULE: Rule = Rule {
    name: "blocked-current",
    group: Group::States,
    severity: Severity::Error,
    also: None,
    summary: "a current source drives a current that no diode lets pass",
    why: "Every way on from the source leads through a diode that points against it and has no breakdown \
          voltage, so what flows in cannot flow out: there is no operating point.",
    remedy: "Turn the diode or the source round, or give the current another path.",
    source: Some(
        "Cut sets of current sources and blocking diodes: Minty, Monotone networks, Proc. R. Soc. \
                  Lond. A 257 (1960) 194-212",
    ),
    failing: "tide gauge buoy: lamp current source\n\
              ILAMP lamp 0 10m\n\
              D1 lamp 0 DRED\n\
              CLAMP lamp 0 1u\n\
              .model DRED D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: lamp current source\n\
              ILAMP 0 lamp 10m\n\
              D1 lamp 0 DRED\n\
              CLAMP lamp 0 1u\n\
              .model DRED D(IS=1e-18 N=2)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    causes(evidence, operating, Verdict::None)
        .iter()
        .filter(|cause| is_ours(evidence, cause) && !is_told(evidence, &cause.cause.elements))
        .map(|cause| super::support::finding(&RULE, evidence, operating, cause, "takes part"))
        .collect()
}

/// A cut set: an independent current source takes part, or a controlled one and a diode that blocks it.
pub fn is_ours(evidence: &Evidence<'_>, cause: &Shown<'_>) -> bool {
    let has = |wanted: fn(&Behaviour) -> bool| {
        cause.cause.elements.iter().any(|&id| wanted(&evidence.circuit.element(id).behaviour))
    };
    has(|b| matches!(b, Behaviour::CurrentSource(_)))
        || (has(is_current) && has(|b| matches!(b, Behaviour::Diode { .. })))
}
