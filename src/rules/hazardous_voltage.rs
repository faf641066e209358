//! Voltages and stored energies that can hurt someone: a caution, never a verdict on safety.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{Case, Operating};
use crate::topology::{dc_value, span_of_values};

pub const RULE: Rule = Rule {
    name: "hazardous-voltage",
    group: Group::Caution,
    severity: Severity::Note,
    also: None,
    summary: "a voltage passes the limits of extra-low voltage, or a capacitor stores a dangerous energy",
    why: "Above 50 V AC (70.7 V peak) or 120 V DC, or with 10 J and more stored at 100 V and more, touching the \
          circuit can injure or kill.",
    remedy: "The prediction is no safety evidence: local codes and licensed practice decide what is needed.",
    source: Some(
        "50 V AC rms and 120 V ripple-free DC: IEC 61140; 10 J at 100 V: the shock threshold for capacitors \
                  of the US Department of Energy laboratories",
    ),
    failing: "tide gauge buoy: bench supply, mains side\n\
              VMAINS line 0 SIN(0 325 50)\n\
              R1 line a 47k\n\
              R2 a 0 1k\n",
    passing: "tide gauge buoy: bench supply, isolated side\n\
              VSEC sec 0 SIN(0 17 50)\n\
              R1 sec a 47k\n\
              R2 a 0 1k\n",
    check: Check::States(check),
};

/// 50 V rms as a peak: what a sine of that size reaches.
const MOVING_PEAK: f64 = 50.0 * std::f64::consts::SQRT_2;
const STEADY: f64 = 120.0;
const ENERGY: f64 = 10.0;
const ENERGY_AT: f64 = 100.0;

/// Something above a limit, with the number that was compared.
struct Hazard {
    element: ElementId,
    message: String,
    /// How far above its limit, as a factor; the greatest is told.
    over: f64,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut worst: Option<Hazard> = None;
    let mut take = |hazard: Hazard| {
        if worst.as_ref().is_none_or(|w| hazard.over > w.over) {
            worst = Some(hazard);
        }
    };
    sources(evidence).for_each(&mut take);
    for case in &operating.cases {
        between_nodes(evidence, case).into_iter().for_each(&mut take);
        stored(evidence, case).into_iter().for_each(&mut take);
    }
    let told = worst.map(|w| {
        evidence
            .about(&RULE, w.element, w.message)
            .help(format!("{} {}", RULE.why, RULE.remedy))
            .label("the greatest of what was compared")
    });
    told.into_iter().collect()
}

/// Independent voltage sources above the limits.
fn sources<'a>(evidence: &'a Evidence<'_>) -> impl Iterator<Item = Hazard> + 'a {
    let stop = evidence.circuit.transient.map(|t| t.stop);
    evidence.circuit.elements().filter_map(move |(id, element)| {
        let Behaviour::VoltageSource(source) = &element.behaviour else { return None };
        let name = evidence.name(id);
        let (low, high) = span_of_values(source, stop);
        let peak = high.abs().max(low.abs());
        let (limit, kind) = if high > low { (MOVING_PEAK, "peak") } else { (STEADY, "DC") };
        let value = if high > low { peak } else { dc_value(source).0.abs() };
        (value > limit).then(|| Hazard {
            element: id,
            message: format!(
                "{name} reaches {}, above the limit of {} {kind} for extra-low voltage",
                quantity(value, "V"),
                quantity(limit, "V")
            ),
            over: value / limit,
        })
    })
}

/// An amplifier as a controlled source has no supply of its own: without a feedback that direct current passes it names
/// any number of volts. What is beyond all independent sources together is then none that anybody meets.
fn amplified_limit(evidence: &Evidence<'_>, case: &Case) -> f64 {
    let is_amplifier = |b: &Behaviour| match b {
        Behaviour::VoltageByVoltage { gain } | Behaviour::VoltageByCurrent { gain, .. } => {
            gain.number.abs() >= AMPLIFIER
        }
        _ => false,
    };
    if !evidence.circuit.elements().any(|(_, e)| is_amplifier(&e.behaviour)) {
        return f64::INFINITY;
    }
    let is_voltage =
        |id: ElementId| matches!(evidence.circuit.element(id).behaviour, Behaviour::VoltageSource(_));
    let sources = case.sources.iter().filter(|(id, _)| is_voltage(*id)).map(|(_, v)| v.abs());
    sources.chain(case.supplies.iter().map(|(_, v)| v.abs())).sum()
}

/// A gain from here on is an amplifier's, open loop.
const AMPLIFIER: f64 = 1e3;

/// The greatest difference between two nodes in one condition.
fn between_nodes(evidence: &Evidence<'_>, case: &Case) -> Option<Hazard> {
    let solution = case.solutions.first()?;
    let limit = amplified_limit(evidence, case);
    let known = solution.nodes.iter().filter_map(|n| Some((n.voltage.known()?, n.node)));
    let known = known.filter(|(volts, _)| volts.abs() <= limit);
    let all = || known.clone().chain([(0.0, NodeId::GROUND)]);
    let (high, top) = all().max_by(|a, b| a.0.total_cmp(&b.0).then(b.1.cmp(&a.1)))?;
    let (low, bottom) = all().min_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)))?;
    let (limit, kind) = if case.instant { (MOVING_PEAK, "peak") } else { (STEADY, "DC") };
    if high - low <= limit {
        return None;
    }
    let at = [top, bottom].into_iter().find_map(|n| evidence.wiring.touching.at(n).first())?;
    let message = format!(
        "{} stand between nodes `{}` and `{}` in condition {}, above the limit of {} {kind} for extra-low voltage",
        quantity(high - low, "V"),
        evidence.node(top),
        evidence.node(bottom),
        case.name,
        quantity(limit, "V")
    );
    Some(Hazard { element: at.element, message, over: (high - low) / limit })
}

/// Capacitors that hold a dangerous energy in one condition.
fn stored(evidence: &Evidence<'_>, case: &Case) -> Option<Hazard> {
    let solution = case.solutions.first()?;
    let limit = amplified_limit(evidence, case);
    let mut volts = vec![None; evidence.circuit.nodes.len()];
    volts[NodeId::GROUND.index()] = Some(0.0);
    for node in &solution.nodes {
        volts[node.node.index()] = node.voltage.known().filter(|v| v.abs() <= limit);
    }
    let hazards = evidence.circuit.elements().filter_map(|(id, element)| {
        let Behaviour::Capacitor { farads, .. } = &element.behaviour else { return None };
        let across: f64 =
            volts[evidence.circuit.node(id, 0).index()]? - volts[evidence.circuit.node(id, 1).index()]?;
        let joules = 0.5 * farads.number * across * across;
        (across.abs() >= ENERGY_AT && joules >= ENERGY).then(|| Hazard {
            element: id,
            message: format!(
                "{} stores {} at {} in condition {}, above the threshold of 10 J at 100 V",
                evidence.name(id),
                quantity(joules, "J"),
                quantity(across.abs(), "V"),
                case.name
            ),
            over: joules / ENERGY,
        })
    });
    hazards.max_by(|a, b| a.over.total_cmp(&b.over).then(b.element.cmp(&a.element)))
}
