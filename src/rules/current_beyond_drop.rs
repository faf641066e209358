//! Currents over the conditions held against the current that the drop belongs to.

use super::support::{In, by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{ElementId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DiodeResult, DropOrigin, Knee, Operating, Trust};

pub const RULE: Rule = Rule {
    name: "current-beyond-drop",
    group: Group::Trust,
    severity: Severity::Note,
    also: Some(Severity::Warning),
    summary: "a diode's current lies more than a decade from the current that its drop belongs to",
    why: "A drop is one voltage; a junction needs N times 60 mV more for each decade of current. More than a decade away the drop is off by more than its scatter, more than two it no longer describes the diode.",
    remedy: "Look at the ends apart, each with the drop that serves it: `--drop`, or a `drop` note for what matters.",
    source: Some("Slope N kT/q ln 10 of the junction law: Shockley, Bell Syst. Tech. J. 28 (1949)"),
    failing: "tide gauge buoy: charge of the backup cell\n\
              *@ range VSOL 1 18\n\
              VSOL sol 0 18\n\
              R1 sol a 100\n\
              D1 a cell DSOL\n\
              R2 cell 0 1meg\n\
              RL cell 0 100k\n\
              *@ drop D1 0.75\n\
              .model DSOL D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: charge of the backup cell\n\
              *@ range VSOL 9 18\n\
              VSOL sol 0 18\n\
              R1 sol a 1k\n\
              D1 a 0 DSOL\n\
              .model DSOL D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    by_diode(operating).iter().filter_map(|(id, results)| judge(evidence, operating, *id, results)).collect()
}

/// The diode carries nothing in the conditions that a model's drop is read from, so 1 mA stands in for its current there:
/// nobody chose that, and the other feed of a pair is no mistake.
fn stands_in(operating: &Operating, diode: &DiodeResult, results: &[In<'_>]) -> bool {
    let is_read = |number: usize| number == 0 || operating.cases.get(number).is_some_and(|c| c.instant);
    let carries = |r: &In<'_>| is_read(r.0) && r.1.state == State::Conducting;
    matches!(diode.drop.origin, DropOrigin::Model { .. }) && !results.iter().any(carries)
}

/// One end of the span of currents.
struct End<'o> {
    number: usize,
    diode: &'o DiodeResult,
    current: f64,
    knee: Knee,
}

impl End<'_> {
    fn decades(&self) -> f64 {
        (self.current / self.knee.reference).log10()
    }

    /// The drop that would belong to its current.
    fn serving(&self) -> f64 {
        self.diode.drop.volts + self.knee.slope * (self.current / self.knee.reference).ln()
    }
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    id: ElementId,
    results: &[In<'_>],
) -> Option<Finding> {
    let end = |&(number, diode): &In<'_>| match (diode.state, diode.current.known(), diode.knee) {
        (State::Conducting, Some(current), Some(knee)) if current > 0.0 && knee.reference > 0.0 => {
            Some((number, current, knee))
        }
        _ => None,
    };
    let mut ends: Vec<End<'_>> = results
        .iter()
        .filter_map(|r| end(r).map(|(number, current, knee)| End { number, diode: r.1, current, knee }))
        .collect();
    ends.sort_by(|a, b| a.current.total_cmp(&b.current));
    let (low, high) = (ends.first()?, ends.last()?);
    let far = if low.decades().abs() > high.decades().abs() { low } else { high };
    let away = far.decades().abs();
    // where even so much does not matter to the current, only the largest distance is worth a word
    let matters = far.diode.trust != Some(Trust::Good);
    if away <= evidence.thresholds.swing_note
        || (!matters && (away <= evidence.thresholds.swing_warning || !far.knee.is_known))
    {
        return None;
    }
    let name = evidence.name(id);
    let side = if far.decades() > 0.0 { "above" } else { "below" };
    let span = match low.current < 0.99 * high.current {
        true => format!("{} to {}", quantity(low.current, "A"), quantity(high.current, "A")),
        false => quantity(far.current, "A"),
    };
    let message = format!(
        "{name} carries {span}, but its drop of {} belongs to {}: {:.1} decades {side} it{}",
        quantity(far.diode.drop.volts, "V"),
        quantity(far.knee.reference, "A"),
        away,
        in_case(operating, far.number)
    );
    let serving = match low.current < 0.99 * high.current {
        true => format!(
            "A drop of {} would serve the low end, {} the high end.",
            quantity(low.serving(), "V"),
            quantity(high.serving(), "V")
        ),
        false => format!("A drop of {} would serve this current.", quantity(far.serving(), "V")),
    };
    let mut finding = evidence.about(&RULE, id, message).label("its current leaves the span of its drop");
    if away > evidence.thresholds.swing_warning && matters && !stands_in(operating, far.diode, results) {
        finding.severity = Severity::Warning;
    }
    Some(finding.help(format!("{} {serving} {}", RULE.why, RULE.remedy)))
}
