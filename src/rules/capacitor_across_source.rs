//! A capacitor straight across an alternating source.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, Shape};
use crate::finding::{Finding, Severity, quantity};

pub const RULE: Rule = Rule {
    name: "capacitor-across-source",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a capacitor lies straight across an alternating voltage source and takes amperes from it",
    why: "The source holds the voltage whatever the capacitor does, so it stores nothing for anybody; it only carries a \
          current that no winding or amplifier was meant to give. A reservoir belongs behind the rectifier.",
    remedy: "Move it behind the diodes, or the source's resistance in front of it.",
    source: Some("Peak current 2 pi f C times the amplitude, by the capacitor's law"),
    failing: "tide gauge buoy: bench supply\n\
              V1 ac 0 SIN(0 15 50)\n\
              C1 ac 0 2200u\n\
              D1 ac raw DRECT\n\
              R1 raw 0 150\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    passing: "tide gauge buoy: bench supply\n\
              V1 ac 0 SIN(0 15 50)\n\
              C1 ac 0 100n\n\
              R1 ac 0 150\n",
    check: Check::Wiring(check),
};

/// Amperes at the crest from which it is no filter.
const MOST: f64 = 1.0;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    evidence.circuit.elements().filter_map(|(id, _)| judge(evidence, id)).collect()
}

fn judge(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Capacitor { farads, .. } = &circuit.element(id).behaviour else { return None };
    let (one, two) = (circuit.node(id, 0), circuit.node(id, 1));
    let rails = &evidence.wiring.rails;
    if one == two || !rails.is_rail(one) || !rails.is_rail(two) {
        return None;
    }
    let sources = [one, two].into_iter().filter_map(|n| rails.source(n));
    let (source, slope) = sources.filter_map(|s| Some((s, slope(evidence, s)?))).next()?;
    let crest = slope * farads.number;
    let is_diode = |e: ElementId| matches!(circuit.element(e).behaviour, Behaviour::Diode { .. });
    let hot = [one, two].into_iter().filter(|&n| n != crate::circuit::NodeId::GROUND);
    let mut near = hot.flat_map(|n| evidence.wiring.touching.at(n));
    if crest < MOST || !near.any(|t| is_diode(t.element)) {
        return None;
    }
    let message = format!(
        "{} ({}) lies straight across {}, which then has to give {} at each crest",
        evidence.name(id),
        quantity(farads.number, "F"),
        evidence.name(source),
        quantity(crest, "A")
    );
    let mut finding = evidence
        .about(&RULE, id, message)
        .label("stores nothing here")
        .also(evidence.statement(source), "holds the voltage whatever the capacitor does")
        .about(evidence.name(source));
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// The steepest slope of a sine, volts a second.
fn slope(evidence: &Evidence<'_>, source: ElementId) -> Option<f64> {
    let Behaviour::VoltageSource(source) = &evidence.circuit.element(source).behaviour else { return None };
    match source.shape {
        // what rides on a steady voltage is ripple
        Some(Shape::Sine { offset, amplitude, frequency, .. }) if offset.abs() < amplitude.abs() => {
            Some(std::f64::consts::TAU * frequency.abs() * amplitude.abs())
        }
        _ => None,
    }
}
