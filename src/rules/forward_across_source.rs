//! A diode forward across a source, with nothing to limit its current.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, Circuit, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::topology::{Loop, Step, Sum, span_of_values, total};

pub const RULE: Rule = Rule {
    name: "forward-across-source",
    group: Group::Orientation,
    severity: Severity::Error,
    also: None,
    summary: "a diode lies forward across a voltage source, and no resistance limits its current",
    why: "The source holds more than any diode drops, so the current has no limit but what the parts survive; \
          the model has no solution.",
    remedy: "A diode that protects a supply lies the other way round, cathode at the positive end; a diode that \
             is to conduct needs a resistance in series.",
    source: Some(
        "A closed path of sources and forward diodes whose voltages exceed the drops has no solution: \
                  Chua, Desoer & Kuh, Linear and Nonlinear Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: surge protection of the supply\n\
              VBAT bat 0 12\n\
              D1 bat 0 DSURGE\n\
              RLOAD bat 0 100\n\
              .model DSURGE D(IS=1n N=1.5)\n",
    passing: "tide gauge buoy: surge protection of the supply\n\
              VBAT bat 0 12\n\
              D1 0 bat DSURGE\n\
              RLOAD bat 0 100\n\
              .model DSURGE D(IS=1n N=1.5)\n",
    check: Check::Wiring(check),
};

/// More than any diode of the table of materials drops; below it the states decide.
const CLEAR: f64 = 4.5;
/// More than this through a junction that nothing else protects.
const SURVIVED: f64 = 10.0;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    evidence.circuit.elements().filter_map(|(id, _)| judge(evidence, id)).collect()
}

fn judge(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Diode { model, .. } = circuit.element(id).behaviour else { return None };
    let series = model.and_then(|m| circuit.model(m).parameter("rs")).map_or(0.0, |v| v.number);
    let (anode, cathode) = (circuit.node(id, 0), circuit.node(id, 1));
    if anode == cathode || !evidence.wiring.potentials.joined(anode, cathode) {
        return None;
    }
    // where sources contradict each other there is no one voltage; that has been told
    let touches = |s: &Step| evidence.wiring.potentials.joined(circuit.node(s.element, 0), anode);
    let contradicts = |l: &Loop| !matches!(l.sum, Sum::Zero) && l.steps.first().is_some_and(touches);
    if evidence.wiring.loops.iter().any(contradicts) {
        return None;
    }
    let steps = evidence.wiring.potentials.walk(circuit, anode, cathode)?;
    let volts = greatest(circuit, &steps)?;
    // its own resistance limits the current, but not to what a junction survives
    if volts < CLEAR || (series > 0.0 && (volts - CLEAR) / series < SURVIVED) {
        return None;
    }
    let names: Vec<String> = steps.iter().map(|s| evidence.name(s.element)).collect();
    let name = evidence.name(id);
    let message = format!(
        "{name} lies forward across {} ({}) and nothing limits its current",
        list(&names),
        quantity(volts, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("anode at the positive end, no resistance");
    for step in steps.iter().take(8) {
        finding = finding.also(evidence.statement(step.element), "drives it");
    }
    finding.subjects.extend(names);
    evidence.name_nodes(&mut finding, &[id]);
    Some(super::support::turn_round(evidence, id, finding.help(format!("{} {}", RULE.why, RULE.remedy))))
}

/// The greatest voltage along the walk that is not a matter of time: `None` where a controlled source takes
/// part, or where a moving source works through an inductor.
fn greatest(circuit: &Circuit, steps: &[Step]) -> Option<f64> {
    let (mut most, mut moving, mut inductor) = (0.0, false, false);
    for step in steps {
        match &circuit.element(step.element).behaviour {
            Behaviour::VoltageSource(source) => {
                let (low, high) = span_of_values(source, circuit.transient.map(|t| t.stop));
                most += if step.forward { high } else { -low };
                moving |= source.shape.is_some();
            }
            Behaviour::Inductor { .. } => inductor = true,
            Behaviour::Resistor(_) => {}
            _ => return None,
        }
    }
    match total(circuit, steps) {
        _ if moving && inductor => None,
        Sum::Volts(volts) if !moving => Some(volts),
        Sum::Zero if !moving => Some(0.0),
        _ => Some(most),
    }
}
