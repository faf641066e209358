//! A source that spends watts in one resistor and feeds nothing else.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::topology::span_of_values;
use petgraph::unionfind::UnionFind;
use rustc_hash::FxHashSet;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "idle-source",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a source drives watts through one resistor and feeds nothing else",
    why: "What it does changes nothing anywhere else, and a resistance so small is no load but lies in series with one. \
          Usually the part that led on from here was taken out, or one of its \
          nodes has become ground.",
    remedy: "Join it to what it was to feed, or take it out. A supply that is here to be measured takes the note \
             `*@ watch NODE`.",
    source: None,
    failing: "tide gauge buoy: clock supply\n\
              V33 v33 0 3.3\n\
              R1 v33 0 1\n\
              VCELL cell 0 3\n\
              R2 cell a 1k\n\
              D1 a clk DSCH\n\
              R3 clk 0 330k\n\
              .model DSCH D(IS=1u N=1.05)\n",
    passing: "tide gauge buoy: clock supply\n\
              V33 v33 0 3.3\n\
              R1 v33 0 1k\n\
              VCELL cell 0 3\n\
              R2 cell v33 1meg\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut sets = UnionFind::<u32>::new(circuit.nodes.len().max(1));
    let off_ground = |id: ElementId| circuit.pins(id).iter().map(|p| p.node).filter(|&n| n != NodeId::GROUND);
    for (id, _) in circuit.elements() {
        let mut nodes = off_ground(id);
        if let Some(first) = nodes.next() {
            nodes.for_each(|n| {
                sets.union(first.0, n.0);
            });
        }
    }
    let mut parts: BTreeMap<u32, Vec<ElementId>> = BTreeMap::new();
    for (id, _) in circuit.elements() {
        if let Some(node) = off_ground(id).next() {
            parts.entry(sets.find(node.0)).or_default().push(id);
        }
    }
    let has_diodes = |part: &Vec<ElementId>| part.iter().any(|&id| is_diode(evidence, id));
    if !parts.values().any(has_diodes) || evidence.is_groundless() {
        return Vec::new();
    }
    let sensed = circuit.elements().filter_map(|(_, e)| controls(&e.behaviour));
    let loose = evidence.loose_ends().iter().map(|end| end.touch.element);
    let used: FxHashSet<ElementId> = sensed.chain(loose).collect();
    let idle = parts.values().filter(|part| is_idle(evidence, part, &used));
    idle.map(|part| judge(evidence, part)).collect()
}

fn is_diode(evidence: &Evidence<'_>, id: ElementId) -> bool {
    matches!(evidence.circuit.element(id).behaviour, Behaviour::Diode { .. })
}

fn is_source(evidence: &Evidence<'_>, id: ElementId) -> bool {
    matches!(evidence.circuit.element(id).behaviour, Behaviour::VoltageSource(_))
}

/// Watts that nobody spends on a load that does nothing else here.
const HEAVY: f64 = 5.0;

/// What the only source of the part spends in its only resistor, in watts; 0 where anything but capacitors is there too.
fn power(evidence: &Evidence<'_>, part: &[ElementId]) -> f64 {
    let circuit = evidence.circuit;
    let (mut volts, mut ohms, mut count) = (0.0_f64, 0.0, 0);
    for &id in part {
        match &circuit.element(id).behaviour {
            Behaviour::VoltageSource(source) => {
                let (low, high) = span_of_values(source, circuit.transient.map(|t| t.stop));
                volts = low.abs().max(high.abs());
                count += 1;
            }
            Behaviour::Resistor(value) => {
                ohms = value.number;
                count += 1;
            }
            Behaviour::Capacitor { .. } => {}
            _ => return 0.0,
        }
    }
    if count == 2 && ohms > 0.0 { volts * volts / ohms } else { 0.0 }
}

fn is_idle(evidence: &Evidence<'_>, part: &[ElementId], used: &FxHashSet<ElementId>) -> bool {
    let noted = &evidence.wiring.noted;
    let is_looked_at = |&id: &ElementId| {
        evidence.circuit.pins(id).iter().any(|p| noted.is_watched(p.node) || noted.is_supplied(p.node))
    };
    power(evidence, part) >= HEAVY
        && !part.iter().any(is_looked_at)
        && !part.iter().any(|id| used.contains(id))
}

/// The source whose current an element senses.
fn controls(behaviour: &Behaviour) -> Option<ElementId> {
    match behaviour {
        Behaviour::VoltageByCurrent { control, .. }
        | Behaviour::CurrentByCurrent { control, .. }
        | Behaviour::CurrentSwitch { control, .. } => *control,
        _ => None,
    }
}

fn judge(evidence: &Evidence<'_>, part: &[ElementId]) -> Finding {
    let source = part.iter().copied().find(|&id| is_source(evidence, id)).unwrap_or(part[0]);
    let others: Vec<ElementId> = part.iter().copied().filter(|&id| id != source).collect();
    let names: Vec<String> = others.iter().map(|&id| evidence.name(id)).collect();
    let message = format!(
        "{} feeds {} and nothing else, with {}",
        evidence.name(source),
        list(&names),
        quantity(power(evidence, part), "W")
    );
    let mut finding = evidence.about(&RULE, source, message).label("feeds nothing else");
    for &id in others.iter().take(4) {
        finding = finding.also(evidence.statement(id), "joins nothing else but ground");
    }
    finding.subjects.extend(names);
    evidence.name_nodes(&mut finding, part);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
