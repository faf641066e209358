//! A diode so near to changing its state that the uncertainty of its drop decides.

use super::{Check, Evidence, Group, Rule, in_cases};
use crate::circuit::{ElementId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, DropOrigin, Operating};
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "near-switching",
    group: Group::States,
    severity: Severity::Note,
    also: None,
    summary: "a diode's state hangs on less than the uncertainty of its drop",
    why: "The voltage that the diode would see differs from its drop by less than the drop itself is known to, so the \
          real part may stand in the other state, or on the soft knee between the two.",
    remedy: "Do not build on this state; where it matters, move the levels apart or look at it with the real \
             characteristic.",
    source: None,
    failing: "tide gauge buoy: comparator level\n\
              V1 in 0 0.72\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n",
    passing: "tide gauge buoy: comparator level\n\
              V1 in 0 3.3\n\
              R1 in a 1k\n\
              D1 a 0 DX\n\
              .model DX D\n",
    check: Check::States(check),
};

/// A diode that sees less resistance than this stands beside others.
const SHARED: f64 = 50.0;

/// A drop that no model or note gives is known to so much; one that they give, to half of it.
const UNKNOWN: f64 = 0.1;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut near: BTreeMap<ElementId, (f64, State, Vec<usize>)> = BTreeMap::new();
    for (number, case) in operating.cases.iter().enumerate() {
        for diode in case.solutions.first().into_iter().flat_map(|s| &s.diodes) {
            let is_left = case.instant && operating.left_to_time.binary_search(&diode.element).is_ok();
            let Some(margin) = diode.margin.filter(|m| *m >= 0.0 && *m < uncertainty(diode)) else {
                continue;
            };
            // at zero volts of an idle part nothing is near
            // beside an equal one it only shares what that one would carry alone
            let idle = diode.view.is_none_or(|v| v.open_circuit == 0.0 || v.resistance < SHARED);
            if is_left || idle || !matches!(diode.state, State::Conducting | State::Blocking) {
                continue;
            }
            let entry = near.entry(diode.element).or_insert((margin, diode.state, Vec::new()));
            entry.0 = entry.0.min(margin);
            entry.2.push(number);
        }
    }
    let tell = |(&id, (margin, state, cases)): (&ElementId, &(f64, State, Vec<usize>))| {
        let message = format!(
            "{} is {} by only {}{}, less than its drop is known to",
            evidence.name(id),
            state.word(),
            quantity(*margin, "V"),
            in_cases(operating, cases)
        );
        let finding = evidence.about(&RULE, id, message).label("may stand either way");
        finding.help(format!("{} {}", RULE.why, RULE.remedy))
    };
    near.iter().map(tell).collect()
}

/// How far the drop of a forward junction may be off; nothing for an ideal diode.
fn uncertainty(diode: &DiodeResult) -> f64 {
    match (&diode.drop.origin, diode.drop.volts) {
        (_, drop) if drop < 0.1 => 0.0,
        (DropOrigin::Option | DropOrigin::Note | DropOrigin::Model { .. }, _) => 0.5 * UNKNOWN,
        _ => UNKNOWN,
    }
}
