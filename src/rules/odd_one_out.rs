//! A diode that points the other way than all its sisters in a matrix or at a gate.

use super::{Check, Evidence, Group, Rule, behind, list, turn_round};
use crate::circuit::{Behaviour, ElementId, ModelId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::Touch;
use rustc_hash::{FxHashMap, FxHashSet};

pub const RULE: Rule = Rule {
    name: "odd-one-out",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "one diode of a matrix or a gate points the other way than all the others of its kind",
    why: "In a matrix all diodes lead from one set of lines to the other, and at a gate all lead to the common node or \
          all away from it. One that points back passes current where none is meant, or none where some is.",
    remedy: "Turn it round.",
    source: None,
    failing: "tide gauge buoy: lamp matrix\n\
              VA ra 0 5\n\
              VB rb 0 0\n\
              R1 ra row1 10\n\
              R2 rb row2 10\n\
              D11 row1 col1 DRED\n\
              D12 row1 col2 DRED\n\
              D13 row1 col3 DRED\n\
              D21 row2 col1 DRED\n\
              D22 col2 row2 DRED\n\
              D23 row2 col3 DRED\n\
              RC1 col1 0 270\n\
              RC2 col2 0 270\n\
              RC3 col3 0 270\n\
              .model DRED D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: alarm gate\n\
              VA a 0 0\n\
              VB b 0 12\n\
              VC c 0 0\n\
              D1 a any DSW\n\
              D2 b any DSW2\n\
              D3 c any DSW3\n\
              R1 any 0 10k\n\
              .model DSW D(IS=2.5n N=1.75)\n\
              .model DSW2 D(IS=2.6n N=1.75)\n\
              .model DSW3 D(IS=2.7n N=1.75)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut by_model: FxHashMap<ModelId, Vec<ElementId>> = FxHashMap::default();
    for (id, element) in circuit.elements() {
        if let Behaviour::Diode { model: Some(model), .. } = element.behaviour
            && circuit.node(id, 0) != circuit.node(id, 1)
        {
            by_model.entry(model).or_default().push(id);
        }
    }
    let mut found: Vec<(ElementId, Vec<ElementId>)> =
        by_model.values().filter(|d| d.len() > 2).flat_map(|d| odd_ones(evidence, d)).collect();
    found.sort();
    found.iter().map(|(odd, sisters)| judge(evidence, *odd, sisters)).collect()
}

/// Diodes of one kind that stand out, each with its sisters.
fn odd_ones(evidence: &Evidence<'_>, diodes: &[ElementId]) -> Vec<(ElementId, Vec<ElementId>)> {
    let circuit = evidence.circuit;
    let mut at: FxHashMap<NodeId, Vec<(ElementId, usize)>> = FxHashMap::default();
    for &id in diodes {
        for pin in [0, 1] {
            at.entry(circuit.node(id, pin)).or_default().push((id, pin));
        }
    }
    let odd = |&id: &ElementId| {
        in_matrix(evidence, &at, id)
            .or_else(|| at_gate(evidence, &at, id))
            .or_else(|| at_ground(evidence, diodes, id))
            .map(|sisters| (id, sisters))
    };
    diodes.iter().filter_map(odd).collect()
}

/// Diodes of one kind of which all the others lead to ground: sensors and references stand so, and clamps come in pairs.
const MOST_AT_GROUND: usize = 24;

/// All its sisters lead from a node to ground, and it alone comes from there.
fn at_ground(evidence: &Evidence<'_>, diodes: &[ElementId], id: ElementId) -> Option<Vec<ElementId>> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    if diodes.len() > MOST_AT_GROUND
        || circuit.node(id, 0) != NodeId::GROUND
        || rails.is_rail(circuit.node(id, 1))
    {
        return None;
    }
    let sisters: Vec<ElementId> = diodes.iter().copied().filter(|&d| d != id).collect();
    let leads_there =
        |&d: &ElementId| circuit.node(d, 1) == NodeId::GROUND && !rails.is_rail(circuit.node(d, 0));
    sisters.iter().all(leads_there).then_some(sisters)
}

/// Lines of a matrix that are gone through at most.
const WIDEST: usize = 2000;

type Meeting = FxHashMap<NodeId, Vec<(ElementId, usize)>>;

/// All others at its anode have their cathodes there, all others at its cathode their anodes, and the lines hang together
/// without it.
fn in_matrix(evidence: &Evidence<'_>, at: &Meeting, id: ElementId) -> Option<Vec<ElementId>> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut sisters = Vec::new();
    for pin in [0, 1] {
        let node = circuit.node(id, pin);
        if rails.is_rail(node) {
            return None;
        }
        let others: Vec<&(ElementId, usize)> = at.get(&node)?.iter().filter(|o| o.0 != id).collect();
        if others.is_empty() || others.iter().any(|o| o.1 == pin) {
            return None;
        }
        sisters.extend(others.iter().map(|o| o.0));
    }
    if sisters.len() < 3 {
        return None;
    }
    hang_together(evidence, at, id).then_some(sisters)
}

/// Whether the lines at both ends of a diode hang together without it, as far as a matrix may reach.
fn hang_together(evidence: &Evidence<'_>, at: &Meeting, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let (start, goal) = (circuit.node(id, 0), circuit.node(id, 1));
    let mut seen = FxHashSet::from_iter([start]);
    let mut queue = vec![start];
    while let Some(node) = queue.pop() {
        // every other line of a matrix is one end of all its diodes
        let mut pins = at.get(&node).into_iter().flatten().filter(|o| o.0 != id).map(|o| o.1);
        if let Some(first) = pins.next()
            && pins.any(|pin| pin != first)
        {
            return false;
        }
        for &(other, pin) in at.get(&node).into_iter().flatten().filter(|o| o.0 != id) {
            let far = circuit.node(other, 1 - pin);
            if far == goal {
                return true;
            }
            // ground joins what does not belong together
            if far != NodeId::GROUND && seen.len() < WIDEST && seen.insert(far) {
                queue.push(far);
            }
        }
    }
    false
}

/// At a node that is no rail two or more sisters point one way, this one the other, and behind each of them stands a
/// source of its own.
fn at_gate(evidence: &Evidence<'_>, at: &Meeting, id: ElementId) -> Option<Vec<ElementId>> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let is_source = |id: ElementId, pin: usize| {
        let end = behind(evidence, id, pin).end;
        let is_source = |&end: &NodeId| rails.is_rail(end) && end != NodeId::GROUND;
        Some(end).filter(is_source).or_else(|| beside(evidence, circuit.node(id, pin)).filter(is_source))
    };
    for pin in [0, 1] {
        let node = circuit.node(id, pin);
        if rails.is_rail(node) {
            continue;
        }
        let Some(own) = is_source(id, 1 - pin) else { continue };
        // what leads on from the gate has no source behind it
        let others: Vec<(ElementId, usize, NodeId)> = at
            .get(&node)?
            .iter()
            .filter(|o| o.0 != id)
            .filter_map(|o| Some((o.0, o.1, is_source(o.0, 1 - o.1)?)))
            .collect();
        let stands_out = others.len() >= 2 && others.iter().all(|o| o.1 != pin && o.2 != own);
        let is_clamp = rails.is_rail(circuit.node(id, 1 - pin))
            && others.iter().all(|o| !rails.is_rail(circuit.node(o.0, 1 - o.1)));
        if stands_out && !is_clamp && !leads_on(evidence, id, 1 - pin, &others) {
            return Some(others.iter().map(|o| o.0).collect());
        }
    }
    None
}

/// What it leads to is a base or a gate, or a source behind a much greater resistance than its sisters have: a battery
/// that is charged.
fn leads_on(
    evidence: &Evidence<'_>,
    id: ElementId,
    pin: usize,
    sisters: &[(ElementId, usize, NodeId)],
) -> bool {
    let circuit = evidence.circuit;
    let is_control = |t: &Touch| {
        t.pin == 1 && matches!(circuit.element(t.element).behaviour, Behaviour::Transistor { .. })
    };
    let far = circuit.node(id, pin);
    let own = behind(evidence, id, pin).ohms;
    let theirs = sisters.iter().map(|s| behind(evidence, s.0, 1 - s.1).ohms).fold(0.0, f64::max);
    evidence.wiring.touching.at(far).iter().any(is_control) || (own >= CHARGING && own > 5.0 * theirs)
}

/// Ohms from which on a source may be there to be charged.
const CHARGING: f64 = 10.0;

/// The rail to which the only resistor at a node leads, whatever else is there.
fn beside(evidence: &Evidence<'_>, node: NodeId) -> Option<NodeId> {
    let circuit = evidence.circuit;
    let touches = evidence.wiring.touching.at(node).iter();
    let mut resistors =
        touches.filter(|t| matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_)));
    let (Some(one), None) = (resistors.next(), resistors.next()) else { return None };
    Some(circuit.node(one.element, 1 - one.pin.min(1) as usize))
}

fn judge(evidence: &Evidence<'_>, odd: ElementId, sisters: &[ElementId]) -> Finding {
    let mut names: Vec<String> = sisters.iter().map(|&id| evidence.name(id)).collect();
    names.sort();
    names.dedup();
    let message = format!(
        "{} points the other way than {}, which are of its kind and share its nodes",
        evidence.name(odd),
        list(&names)
    );
    let mut finding = evidence.about(&RULE, odd, message).label("points back");
    for &id in sisters.iter().take(4) {
        finding = finding.also(evidence.statement(id), "as the others do");
    }
    evidence.name_nodes(&mut finding, &[odd]);
    turn_round(evidence, odd, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
