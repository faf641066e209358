//! Currents over time held against the current that the drop belongs to.

use super::support::{by_diode, folded};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, ModelId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DropOrigin, Knee, Operating, Quantity};
use crate::swing::{OverTime, Swing};
use std::collections::BTreeSet;

pub const RULE: Rule = Rule {
    name: "charge-beyond-drop",
    group: Group::Trust,
    severity: Severity::Note,
    also: Some(Severity::Warning),
    summary: "most of a diode's charge flows at currents far from the one that its drop belongs to",
    why: "Over time the drop is one voltage too, while a junction needs N times 60 mV more for each decade of current: what the pass over time tells of this diode is then off by that.",
    remedy: "Give the drop that belongs to the current at which most of the charge flows: a `drop` note, or `--drop`.",
    source: Some("Slope N kT/q ln 10 of the junction law: Shockley, Bell Syst. Tech. J. 28 (1949)"),
    failing: "tide gauge buoy: bench supply\n\
              VS s 0 SIN(0 17 50)\n\
              D1 s out DREC\n\
              C1 out 0 1000u\n\
              RL out 0 150\n\
              *@ drop D1 0.3\n\
              .tran 1m 0.2\n\
              .model DREC D(IS=2n N=1.8 RS=0.05)\n",
    passing: "tide gauge buoy: bench supply\n\
              VS s 0 SIN(0 17 50)\n\
              D1 s out DREC\n\
              RS out load 10\n\
              RL load 0 150\n\
              .tran 1m 0.2\n\
              .model DREC D(IS=2n N=1.8)\n",
    check: Check::Time(check),
};

/// By so much of the voltage that the diode switches its drop may be off before that is likely a mistake: a rectifier
/// of 17 V is a good one with a drop that is 0.3 V off. The same share divides fair trust from poor.
const MATTERS: f64 = 0.2;

fn check(evidence: &Evidence<'_>, operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let drops = by_diode(operating);
    let knee = |id: ElementId| {
        let at = drops.binary_search_by_key(&id, |(id, _)| *id).ok()?;
        let (_, diode) = drops[at].1.first()?;
        Some((diode.knee?, &diode.drop))
    };
    let carrying = carrying(operating);
    // one finding for each model: the legs of a bridge share their cause
    let mut models: Vec<(Option<ModelId>, Vec<ElementId>, Vec<Finding>)> = Vec::new();
    for diode in &swing.diodes {
        let (Some(time), Some((knee, drop))) = (&diode.over_time, knee(diode.element)) else { continue };
        let Some(mut finding) = judge(evidence, diode.element, time, &knee, drop.volts) else { continue };
        // where no instant by itself shows a forward current, 1 mA stands in for it, and nobody chose that
        if matches!(drop.origin, DropOrigin::Model { .. }) && !carrying.contains(&diode.element) {
            finding.severity = Severity::Note;
        }
        let model = match evidence.circuit.element(diode.element).behaviour {
            Behaviour::Diode { model, .. } => model,
            _ => None,
        };
        match models.iter_mut().find(|(known, ..)| *known == model) {
            Some((_, ids, list)) => {
                ids.push(diode.element);
                list.push(finding);
            }
            None => models.push((model, vec![diode.element], vec![finding])),
        }
    }
    models.into_iter().filter_map(|(_, ids, list)| folded(evidence, list, &ids)).collect()
}

/// Diodes that carry a forward current in some condition or instant.
fn carrying(operating: &Operating) -> BTreeSet<ElementId> {
    let diodes = operating.cases.iter().flat_map(|case| &case.solutions).flat_map(|s| &s.diodes);
    let carries = |current: Quantity| match current {
        Quantity::Known(i) => i > 0.0,
        Quantity::Open(range) => range.high > 0.0,
        Quantity::Unknown => false,
    };
    diodes.filter(|d| carries(d.current)).map(|d| d.element).collect()
}

fn judge(evidence: &Evidence<'_>, id: ElementId, time: &OverTime, knee: &Knee, drop: f64) -> Option<Finding> {
    let (low, high) = time.charge_span?;
    let decades = |current: f64| (current / knee.reference).log10();
    // a drop that nobody gave claims nothing about the current at which it holds
    let usable = knee.is_known && low > 0.0 && high > 0.0 && knee.reference > 0.0;
    let away = decades(low).abs().max(decades(high).abs());
    if !usable || away <= evidence.thresholds.swing_note {
        return None;
    }
    let serving = |current: f64| drop + knee.slope * (current / knee.reference).ln();
    let message = format!(
        "{} passes from 5 % to 95 % of its charge at {} to {}, but its drop of {} belongs to {}: {away:.1} decades away",
        evidence.name(id),
        quantity(low, "A"),
        quantity(high, "A"),
        quantity(drop, "V"),
        quantity(knee.reference, "A"),
    );
    let mut finding = evidence.about(&RULE, id, message).label("its charge flows beside its drop");
    let off = (serving(low) - drop).abs().max((serving(high) - drop).abs());
    if away > evidence.thresholds.swing_warning && off > MATTERS * time.peak_reverse_voltage {
        finding.severity = Severity::Warning;
    }
    let told = format!(
        "A drop of {} would serve the low end, {} the high end.",
        quantity(serving(low), "V"),
        quantity(serving(high), "V")
    );
    Some(finding.help(format!("{} {told} {}", RULE.why, RULE.remedy)))
}
