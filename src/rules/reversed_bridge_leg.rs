//! A rectifier leg that points the wrong way: two diodes then lead straight from one end of the winding to another.

use super::{Check, Evidence, Group, Rule, list, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::{Driven, gives_light};
use rustc_hash::{FxHashMap, FxHashSet};
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "reversed-bridge-leg",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a leg of a rectifier lies the wrong way round and shorts the winding through another",
    why: "All legs at one output of a rectifier point the same way. Where one points back, two of them lead from one end \
          of the winding straight to the other past the load, and short it in every other half-wave.",
    remedy: "Turn that leg round.",
    source: Some("Bridge and centre-tapped rectifier, common practice"),
    failing: "tide gauge buoy: bench supply\n\
              VSEC w1 w2 17\n\
              RSEC w1 ac1 0.8\n\
              D1 ac1 raw DRECT\n\
              D2 raw w2 DRECT\n\
              D3 0 ac1 DRECT\n\
              D4 0 w2 DRECT\n\
              C1 raw 0 2200u\n\
              R1 raw 0 100\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    passing: "tide gauge buoy: bench supply\n\
              VSEC w1 w2 17\n\
              RSEC w1 ac1 0.8\n\
              D1 ac1 raw DRECT\n\
              D2 w2 raw DRECT\n\
              D3 0 ac1 DRECT\n\
              D4 0 w2 DRECT\n\
              C1 raw 0 2200u\n\
              R1 raw 0 100\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    check: Check::Wiring(check),
};

/// A leg between an end of the winding and an output: leads out of the winding, or back to it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Leg {
    /// The end of the winding.
    pub end: NodeId,
    /// It leads from the winding to the output.
    pub out: bool,
    /// The diode.
    pub diode: ElementId,
}

/// The legs at each node that is no end of the winding, by that node.
pub fn legs(evidence: &Evidence<'_>, driven: &Driven) -> BTreeMap<NodeId, Vec<Leg>> {
    let circuit = evidence.circuit;
    let ends: FxHashSet<NodeId> = driven.ends.iter().copied().collect();
    let mut outputs: BTreeMap<NodeId, Vec<Leg>> = BTreeMap::new();
    for &end in &driven.ends {
        for touch in evidence.wiring.touching.at(end) {
            let is_diode = matches!(circuit.element(touch.element).behaviour, Behaviour::Diode { .. });
            if !is_diode || gives_light(circuit, touch.element) {
                continue;
            }
            let output = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
            if !ends.contains(&output) {
                let leg = Leg { end, out: touch.pin == 0, diode: touch.element };
                outputs.entry(output).or_default().push(leg);
            }
        }
    }
    outputs
}

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let mut found: FxHashMap<ElementId, Finding> = FxHashMap::default();
    for driven in &evidence.wiring.driven {
        let outputs = legs(evidence, driven);
        // where the legs of several outputs point both ways, they are meant to: a ring modulator, a sampling gate
        let mixed = outputs.values().filter(|legs| is_mixed(legs)).count() + between_ends(evidence, driven);
        for (&output, legs) in outputs.iter().filter(|_| mixed == 1) {
            let is_driven = || evidence.wiring.driven.iter().any(|d| d.ends.contains(&output));
            if is_mixed(legs) && has_load(evidence, output, legs) && !is_driven() {
                let turned = turned(&outputs, output, legs);
                let finding = judge(evidence, output, legs, turned);
                found.entry(turned.unwrap_or(legs[0]).diode).or_insert(finding);
            }
        }
    }
    let mut findings: Vec<(ElementId, Finding)> = found.into_iter().collect();
    findings.sort_by_key(|f| f.0);
    findings.into_iter().map(|f| f.1).collect()
}

/// Ends of which diodes lead in from one other end and out to another, as if they were outputs themselves.
fn between_ends(evidence: &Evidence<'_>, driven: &Driven) -> usize {
    let circuit = evidence.circuit;
    let ends: FxHashSet<NodeId> = driven.ends.iter().copied().collect();
    let legs_at = |output: NodeId| -> Vec<Leg> {
        let touches = evidence.wiring.touching.at(output).iter();
        let diodes =
            touches.filter(|t| matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. }));
        let leg = diodes.map(|t| Leg {
            end: circuit.node(t.element, 1 - t.pin.min(1) as usize),
            out: t.pin == 1,
            diode: t.element,
        });
        leg.filter(|l| ends.contains(&l.end) && l.end != output).collect()
    };
    driven.ends.iter().filter(|&&end| end != NodeId::GROUND && is_mixed(&legs_at(end))).count()
}

/// Two of the legs lead from one end of the winding straight to another. Pairs of diodes across each other are meant to
/// pass both ways.
fn is_mixed(legs: &[Leg]) -> bool {
    if legs.iter().any(|a| legs.iter().any(|b| a.end == b.end && a.out != b.out)) {
        return false;
    }
    let apart = |a: &Leg, b: &Leg| a.end != b.end && a.out != b.out;
    legs.iter().any(|a| legs.iter().any(|b| apart(a, b)))
}

/// Something else leads on from the output: without it the two are a limiter across the winding.
fn has_load(evidence: &Evidence<'_>, output: NodeId, legs: &[Leg]) -> bool {
    let circuit = evidence.circuit;
    let mut others = evidence.wiring.touching.carrying(circuit, output);
    others.any(|t| !legs.iter().any(|l| l.diode == t.element)) && !evidence.wiring.rails.is_rail(output)
        || output == NodeId::GROUND
}

/// Which of the legs points back: another output says which way this one must go, else the fewer.
fn turned(outputs: &BTreeMap<NodeId, Vec<Leg>>, output: NodeId, legs: &[Leg]) -> Option<Leg> {
    let whole = outputs.iter().find(|(node, other)| {
        **node != output && other.len() > 1 && other.iter().all(|l| l.out == other[0].out)
    });
    let count = |out: bool| legs.iter().filter(|l| l.out == out).count();
    let wrong = match whole {
        Some((_, other)) => other[0].out,
        None if count(true) != count(false) => count(true) < count(false),
        None => return None,
    };
    let mut wrong = legs.iter().filter(|l| l.out == wrong);
    let first = wrong.next().copied();
    first.filter(|_| wrong.next().is_none())
}

fn judge(evidence: &Evidence<'_>, output: NodeId, legs: &[Leg], turned: Option<Leg>) -> Finding {
    let main = turned.unwrap_or(legs[0]);
    let others: Vec<&Leg> = legs.iter().filter(|l| l.diode != main.diode).collect();
    let names: Vec<String> = others.iter().map(|l| evidence.name(l.diode)).collect();
    let opposite = others.iter().find(|l| l.out != main.out).map_or(main.end, |l| l.end);
    let (from, to) = if main.out { (main.end, opposite) } else { (opposite, main.end) };
    let message = format!(
        "{} and {} lead from `{}` straight to `{}` by way of `{}`, past the load: {}",
        evidence.name(main.diode),
        list(&names),
        evidence.node(from),
        evidence.node(to),
        evidence.node(output),
        match turned {
            Some(_) => format!("{} lies the wrong way round", evidence.name(main.diode)),
            None => "one of them lies the wrong way round".into(),
        }
    );
    let mut finding = evidence.about(&RULE, main.diode, message).label("this leg points back");
    for leg in &others {
        finding = finding.also(evidence.statement(leg.diode), "leads to the same output");
    }
    finding.subjects.extend(names);
    let diodes: Vec<ElementId> = legs.iter().map(|l| l.diode).collect();
    evidence.name_nodes(&mut finding, &diodes);
    let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    match turned {
        Some(leg) => turn_round(evidence, leg.diode, finding),
        None => finding,
    }
}
