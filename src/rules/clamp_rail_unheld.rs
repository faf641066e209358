//! The rail that input clamps lead to is held by nothing but the clamps themselves.

use super::{Check, Evidence, Group, Regions, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::is_lead;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "clamp-rail-unheld",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "the supply that input clamps lead to is held by nothing, so the inputs feed it",
    why: "A clamp keeps a signal below its rail only where a source holds the rail. Here nothing feeds the node but the \
          signals themselves, through the clamps that are to protect them.",
    remedy: "Join the node to its supply; on a board without sources say what holds it: `*@ supply NODE VOLTS`.",
    source: None,
    failing: "tide gauge buoy: sensor inputs\n\
              VTEMP temp 0 1.24\n\
              R1 temp in1 2k2\n\
              D1 in1 vdd DSW\n\
              D2 0 in1 DSW\n\
              RLOG vdd 0 1k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: sensor inputs\n\
              V33 vdd 0 3.3\n\
              VTEMP temp 0 1.24\n\
              R1 temp in1 2k2\n\
              D1 in1 vdd DSW\n\
              D2 0 in1 DSW\n\
              RLOG vdd 0 1k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut clamps: BTreeMap<NodeId, Vec<ElementId>> = BTreeMap::new();
    for (id, element) in circuit.elements() {
        let (input, rail) = (circuit.node(id, 0), circuit.node(id, 1));
        if matches!(element.behaviour, Behaviour::Diode { .. })
            && !rails.is_rail(input)
            && !rails.is_rail(rail)
            && is_signal(evidence, input)
        {
            clamps.entry(rail).or_default().push(id);
        }
    }
    if clamps.is_empty() {
        return Vec::new();
    }
    let regions = Regions::of(evidence, |_| true);
    let unheld = clamps.iter().filter(|(rail, diodes)| {
        regions.is_unfed(regions.region(**rail)) && is_only_clamped(evidence, **rail, diodes)
    });
    unheld.map(|(&rail, diodes)| judge(evidence, rail, diodes)).collect()
}

/// A steady source drives the node through a resistor, and another clamp leads to it from ground.
fn is_signal(evidence: &Evidence<'_>, node: NodeId) -> bool {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let steady = |rail: NodeId| {
        rails.source(rail).is_some_and(
            |id| matches!(&circuit.element(id).behaviour, Behaviour::VoltageSource(s) if s.shape.is_none()),
        )
    };
    let is_driven = touching.direct(circuit, node).any(|t| {
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        is_lead(&circuit.element(t.element).behaviour)
            && steady(touching.walk(circuit, rails, far, t.element, is_lead).end)
    });
    let from_ground = touching.at(node).iter().any(|t| {
        t.pin == 1
            && matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
            && circuit.node(t.element, 0) == NodeId::GROUND
    });
    is_driven && from_ground
}

/// No other diode leads to the rail.
fn is_only_clamped(evidence: &Evidence<'_>, rail: NodeId, clamps: &[ElementId]) -> bool {
    let circuit = evidence.circuit;
    evidence.wiring.touching.at(rail).iter().all(|t| {
        t.pin != 1
            || !matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
            || clamps.contains(&t.element)
            || circuit.node(t.element, 0) == NodeId::GROUND
    })
}

fn judge(evidence: &Evidence<'_>, rail: NodeId, clamps: &[ElementId]) -> Finding {
    let names: Vec<String> = clamps.iter().map(|&id| evidence.name(id)).collect();
    let node = evidence.node(rail);
    let message = format!(
        "nothing holds `{node}` but the inputs that {} {} to clamp to it",
        list(&names),
        if names.len() == 1 { "is" } else { "are" }
    );
    let mut finding = evidence.about(&RULE, clamps[0], message).label("leads to a rail that nothing holds");
    for &id in clamps.iter().skip(1).take(4) {
        finding = finding.also(evidence.statement(id), "as does this");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    finding.subjects.push(node);
    evidence.name_nodes(&mut finding, clamps);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
