//! An envelope detector whose time constant does not fit its carrier and modulation.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId, Shape};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::{OverTime, Swing};
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "detector-time-constant",
    group: Group::Time,
    severity: Severity::Warning,
    also: None,
    summary: "the R·C of an envelope detector is too long for its modulation, or too short for its carrier",
    why: "Between two crests of the carrier the capacitor must keep its voltage, and over one swing of the modulation it \
          must lose it: 1/fc is far below R·C, and R·C is at most √(1 − m²)/(2π·m·fm). Too long, and the output sails \
          over the valleys of the envelope; too short, and the carrier comes through.",
    remedy: "Choose R·C between the two, near the geometric mean where there is room.",
    source: Some(
        "No diagonal clipping while R·C ≤ √(1 − m²)/(2π·m·fm): the usual bound of texts on communication circuits",
    ),
    failing: "tide gauge buoy: telemetry tone detector, 1 kHz tone on 50 kHz\n\
              VC c1 0 SIN(0 2 50k)\n\
              VU c2 c1 SIN(0 0.8 51k)\n\
              VL rf c2 SIN(0 0.8 49k)\n\
              D1 rf env DDET\n\
              C1 env 0 100n\n\
              R1 env 0 10k\n\
              .model DDET D(RS=10)\n\
              *@ made-of DDET germanium\n",
    passing: "tide gauge buoy: telemetry tone detector, 1 kHz tone on 50 kHz\n\
              VC c1 0 SIN(0 2 50k)\n\
              VU c2 c1 SIN(0 0.8 51k)\n\
              VL rf c2 SIN(0 0.8 49k)\n\
              D1 rf env DDET\n\
              C1 env 0 3.9n\n\
              R1 env 0 10k\n\
              .model DDET D(RS=10)\n\
              *@ made-of DDET germanium\n",
    check: Check::Time(check),
};

/// Fewer carrier periods than this in one period of the modulation are no carrier.
const LEAST_CYCLES: f64 = 8.0;

/// A gap of more carrier periods than this between two charges is a crest that was missed.
const MISSED: f64 = 1.6;

/// Carrier periods that the time constant must last.
const LEAST: f64 = 1.5;

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let (Some(period), true, Some(carrier)) = (swing.period, swing.periodic, carrier(evidence)) else {
        return Vec::new();
    };
    if period * carrier < LEAST_CYCLES {
        return Vec::new();
    }
    let timed = swing.diodes.iter().filter_map(|d| Some((d.element, d.over_time.as_ref()?)));
    timed.filter_map(|(id, time)| judge(evidence, id, time, period, carrier)).collect()
}

/// Frequency of the greatest of several sines that are close together: a carrier with its side tones.
fn carrier(evidence: &Evidence<'_>) -> Option<f64> {
    let sine = |behaviour: &Behaviour| match behaviour {
        Behaviour::VoltageSource(source) | Behaviour::CurrentSource(source) => match source.shape {
            Some(Shape::Sine { amplitude, frequency, .. }) if amplitude != 0.0 => {
                Some((amplitude.abs(), frequency))
            }
            _ => None,
        },
        _ => None,
    };
    let sines: Vec<(f64, f64)> =
        evidence.circuit.elements.iter().filter_map(|e| sine(&e.behaviour)).collect();
    let &(_, carrier) = sines.iter().max_by(|a, b| a.0.total_cmp(&b.0))?;
    let is_side = |f: f64| f != carrier && (f - carrier).abs() < 0.5 * carrier;
    sines.iter().any(|&(_, f)| is_side(f)).then_some(carrier)
}

fn judge(
    evidence: &Evidence<'_>,
    id: ElementId,
    time: &OverTime,
    period: f64,
    carrier: f64,
) -> Option<Finding> {
    let (node, constant) = [1, 0].into_iter().find_map(|pin| {
        let node = evidence.circuit.node(id, pin);
        Some((node, time_constant(evidence, id, node)?))
    })?;
    if time.intervals.is_empty() {
        return None;
    }
    let name = evidence.name(id);
    let about = format!("its R·C at `{}` is {}", evidence.node(node), quantity(constant, "s"));
    let cycle = 1.0 / carrier;
    let gap = longest_gap(time, period);
    let message = if gap > MISSED * cycle {
        format!(
            "{name} detects an envelope and misses {:.0} crests of the {} carrier in a row: {about}, too long for a \
             modulation that repeats every {}",
            (gap / cycle).round() - 1.0,
            quantity(carrier, "Hz"),
            quantity(period, "s")
        )
    } else if constant < LEAST * cycle {
        format!(
            "{name} detects an envelope and lets the {} carrier through: {about}, and one period of the carrier is {}",
            quantity(carrier, "Hz"),
            quantity(cycle, "s")
        )
    } else {
        return None;
    };
    let finding = evidence.about(&RULE, id, message).label("the detector");
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// Longest time between two stretches of conduction, round the end of the period.
fn longest_gap(time: &OverTime, period: f64) -> f64 {
    let starts = time.intervals.iter().map(|i| i.0);
    let next = starts.clone().skip(1).chain(starts.take(1).map(|first| first + period));
    time.intervals.iter().zip(next).map(|(interval, next)| next - interval.1).fold(0.0, f64::max)
}

/// R·C of a node to which a capacitor and resistors lead, all to one and the same other node.
fn time_constant(evidence: &Evidence<'_>, diode: ElementId, node: NodeId) -> Option<f64> {
    let circuit = evidence.circuit;
    // by the other node: whether a coupling part stands first in the file must not matter
    let mut far: BTreeMap<NodeId, (f64, f64)> = BTreeMap::new();
    for touch in evidence.wiring.touching.at(node) {
        let id = touch.element;
        if id == diode {
            continue;
        }
        let Some(other) = circuit.pins(id).iter().map(|p| p.node).find(|n| *n != node) else { continue };
        match &circuit.element(id).behaviour {
            Behaviour::Capacitor { farads, .. } if farads.number > 0.0 => {
                far.entry(other).or_default().0 += farads.number;
            }
            Behaviour::Resistor(ohms) if ohms.number > 0.0 => {
                far.entry(other).or_default().1 += 1.0 / ohms.number;
            }
            _ => {}
        }
    }
    // of several the largest capacitor smooths
    let both = far.into_values().filter(|(farads, siemens)| *farads > 0.0 && *siemens > 0.0);
    both.max_by(|a, b| a.0.total_cmp(&b.0)).map(|(farads, siemens)| farads / siemens)
}
