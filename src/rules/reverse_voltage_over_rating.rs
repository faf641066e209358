//! A diode whose peak inverse voltage over time passes what it is rated for.

use super::over_rating::{self, BEYOND};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::{OverTime, Swing};
use crate::text::Span;

pub const RULE: Rule = Rule {
    name: "reverse-voltage-over-rating",
    group: Group::Time,
    severity: Severity::Warning,
    also: None,
    summary: "over time a diode sees more reverse voltage than it is rated for",
    why: "A rectifier diode meets its largest reverse voltage a half-wave after the reservoir has charged, when no DC \
          answer looks. Beyond its rating it breaks down, and the charge it lets back flows at that full voltage.",
    remedy: "Take a diode rated for at least this voltage with room for surges (half as much again is usual), or a \
             circuit that asks less of it, such as a bridge instead of a single diode.",
    source: Some(
        "Peak inverse voltage 2·Vp − Vd of a diode that feeds a reservoir capacitor, Vp − Vd in a bridge: common \
         practice, from Kirchhoff's voltage law",
    ),
    failing: "tide gauge buoy: half-wave charger, PIV 33 V\n\
              V1 ac 0 SIN(0 17 50)\n\
              D1 ac raw DSCH\n\
              C1 raw 0 1000u\n\
              RLOAD raw 0 1k\n\
              .model DSCH D(RS=50m)\n\
              *@ rating DSCH vr=20\n",
    passing: "tide gauge buoy: half-wave charger, PIV 33 V\n\
              V1 ac 0 SIN(0 17 50)\n\
              D1 ac raw DRECT\n\
              C1 raw 0 1000u\n\
              RLOAD raw 0 1k\n\
              .model DRECT D(RS=50m)\n\
              *@ rating DRECT vr=100\n",
    check: Check::Time(check),
};

/// Breakdown voltages below this are those of diodes that are meant to break down.
const MEANT: f64 = 40.0;

fn check(evidence: &Evidence<'_>, operating: &Operating, swing: &Swing) -> Vec<Finding> {
    if swing.span.is_none() {
        return Vec::new();
    }
    let timed = swing.diodes.iter().filter_map(|d| Some((d.element, d.over_time.as_ref()?)));
    timed
        .filter_map(|(id, time)| match evidence.reverse_rating(id) {
            // a condition that passes it already has its finding
            Some((volts, _)) if over_rating::reverse_voltage(operating, id) > volts * BEYOND => None,
            Some((volts, note)) => over_note(evidence, id, time, volts, note.span),
            None => over_model(evidence, id, time, swing.window),
        })
        .collect()
}

fn over_note(
    evidence: &Evidence<'_>,
    id: ElementId,
    time: &OverTime,
    volts: f64,
    span: Span,
) -> Option<Finding> {
    let is_over = time.peak_reverse_voltage > volts * BEYOND;
    if !is_over {
        return None;
    }
    let message = format!(
        "{} sees {} in reverse at its worst, and is rated for {}",
        evidence.name(id),
        quantity(time.peak_reverse_voltage, "V"),
        quantity(volts, "V")
    );
    Some(finding(evidence, id, message).also(span, "its rating"))
}

/// A rectifier that its model lets break down.
fn over_model(evidence: &Evidence<'_>, id: ElementId, time: &OverTime, window: f64) -> Option<Finding> {
    let Behaviour::Diode { model: Some(model), .. } = evidence.circuit.element(id).behaviour else {
        return None;
    };
    let model = evidence.circuit.model(model);
    let breakdown = model.parameter("bv")?.number.abs();
    // forward charge is what a rectifier is for; a clamp that is meant to break down carries little of it
    let rectifies = time.current_mean > 0.0 && time.conducting_share > 0.0;
    if breakdown < MEANT || time.breakdown_intervals.is_empty() || !rectifies {
        return None;
    }
    let lasting: f64 = time.breakdown_intervals.iter().map(|(from, to)| to - from).sum();
    let message = format!(
        "{} breaks down at the {} of its model for {:.2} % of the time, with up to {} in reverse",
        evidence.name(id),
        quantity(breakdown, "V"),
        100.0 * lasting / window,
        quantity(time.reverse_peak, "A")
    );
    Some(finding(evidence, id, message).also(model.statement, "its breakdown voltage"))
}

fn finding(evidence: &Evidence<'_>, id: ElementId, message: String) -> Finding {
    evidence
        .about(&RULE, id, message)
        .label("beyond its reverse voltage")
        .help(format!("{} {}", RULE.why, RULE.remedy))
}
