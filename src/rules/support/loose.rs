//! Loose ends: nodes with one connection that are very likely meant to have more. Which of them are slips of
//! the pen in a node's name is found here too, since a slip and its loose end are one cause.

use super::Evidence;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, ScopeId};
use crate::topology::{Touch, coupled_coils, is_opaque, is_slip, similar};
use rustc_hash::FxHashSet;

/// A node with one connection.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct LooseEnd {
    /// The node.
    pub node: NodeId,
    /// The only element there, and its first pin there.
    pub touch: Touch,
    /// The pin of an instance left open: usual for an unused pin of a part.
    pub unused_pin: bool,
    /// The node whose name it probably should bear.
    pub meant: Option<NodeId>,
}

/// All loose ends, in the order of the nodes.
pub fn find(evidence: &Evidence<'_>) -> Vec<LooseEnd> {
    let circuit = evidence.circuit;
    let (touching, noted) = (&evidence.wiring.touching, &evidence.wiring.noted);
    let coupled = coupled_coils(circuit);
    let mut mentioned: Option<FxHashSet<String>> = None;
    let mut loose = Vec::new();
    for n in 1..circuit.nodes.len() {
        let node = NodeId::new(n);
        let Some(touch) = touching.only(node).or_else(|| single_port(evidence, node)) else { continue };
        if noted.is_supplied(node) || noted.is_watched(node) || may_end_here(evidence, touch, &coupled) {
            continue;
        }
        let mentioned = mentioned.get_or_insert_with(|| mentioned_nodes(evidence));
        if mentioned.contains(&circuit.text(circuit.nodes[n].name).to_lowercase()) {
            continue;
        }
        let unused_pin = circuit.element(touch.element).scope != circuit.nodes[n].scope;
        loose.push(LooseEnd { node, touch, unused_pin, meant: None });
    }
    find_slips(evidence, &mut loose);
    loose
}

/// The first pin inside an instance to which a node leads that nothing else touches: all its pins lie inside that one
/// instance and bear one name there. (Two ports of an instance that are tied together are joined by that.)
fn single_port(evidence: &Evidence<'_>, node: NodeId) -> Option<Touch> {
    let circuit = evidence.circuit;
    let outer = circuit.nodes[node.index()].scope;
    let touches = evidence.wiring.touching.at(node);
    let first = *touches.first()?;
    let instance = instance_below(circuit, circuit.element(first.element).scope, outer)?;
    let mut port: Option<String> = None;
    for touch in touches {
        let element = circuit.element(touch.element);
        if instance_below(circuit, element.scope, outer) != Some(instance) {
            return None;
        }
        // what lies deeper has names of its own
        let pin = circuit.pins(touch.element).get(touch.pin as usize).filter(|_| element.scope == instance);
        if let Some(pin) = pin {
            let name = evidence.sources.slice(pin.span).to_lowercase();
            if port.get_or_insert_with(|| name.clone()) != &name {
                return None;
            }
        }
    }
    port.map(|_| first)
}

/// The instance directly inside `outer` that holds `scope`.
pub fn instance_below(circuit: &Circuit, scope: ScopeId, outer: ScopeId) -> Option<ScopeId> {
    let mut at = scope;
    loop {
        let parent = circuit.scopes.get(at.index())?.parent?;
        if parent == outer {
            return Some(at);
        }
        at = parent;
    }
}

/// A part of two or three ports of which one leads nowhere does nothing any more; an end of a single resistor inside, as
/// in a potentiometer, may well be left open.
pub fn is_needed_port(evidence: &Evidence<'_>, end: &LooseEnd) -> bool {
    let circuit = evidence.circuit;
    let touches = evidence.wiring.touching.at(end.node);
    let outer = circuit.nodes[end.node.index()].scope;
    let Some(instance) = instance_below(circuit, circuit.element(end.touch.element).scope, outer) else {
        return false;
    };
    let is_resistor = |t: &Touch| matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_));
    let is_diode = |t: &Touch| matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. });
    let ports = ports_of(circuit, instance);
    match ports.len() {
        0..=2 => true,
        3 => !matches!(touches, [one] if is_resistor(one) && leads_to_resistors(evidence, one)),
        // an output may well be left open, the supply of its clamps not
        4 if ports.contains(&NodeId::GROUND) => touches.iter().all(is_diode),
        _ => false,
    }
}

/// Nothing but resistors meets at the far end of a resistor, as at a wiper.
fn leads_to_resistors(evidence: &Evidence<'_>, touch: &Touch) -> bool {
    let circuit = evidence.circuit;
    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
    let is_resistor = |t: &Touch| matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_));
    evidence.wiring.touching.at(far).iter().all(is_resistor)
}

/// The nodes of outer circuits that an instance touches.
fn ports_of(circuit: &Circuit, instance: ScopeId) -> FxHashSet<NodeId> {
    let inside = |mut scope: ScopeId| loop {
        if scope == instance {
            return true;
        }
        match circuit.scopes.get(scope.index()).and_then(|s| s.parent) {
            Some(parent) => scope = parent,
            None => return false,
        }
    };
    let elements = circuit.elements().filter(|(_, e)| inside(e.scope));
    let pins = elements.flat_map(|(id, _)| circuit.pins(id)).map(|p| p.node);
    pins.filter(|n| !inside(circuit.nodes[n.index()].scope)).collect()
}

/// A gain from here on needs feedback, or a load that it switches.
const AMPLIFIER: f64 = 1000.0;

/// Elements whose pin may well be left open: unknown ones, positive outputs of controlled voltage sources, the ends of
/// an unused winding.
fn may_end_here(evidence: &Evidence<'_>, touch: Touch, coupled: &FxHashSet<ElementId>) -> bool {
    let circuit = evidence.circuit;
    match circuit.element(touch.element).behaviour {
        // a probe may; an amplifier of high gain is there to drive something
        Behaviour::VoltageByVoltage { ref gain } => touch.pin == 0 && gain.number.abs() < AMPLIFIER,
        Behaviour::VoltageByCurrent { .. } => touch.pin == 0,
        Behaviour::Inductor { .. } if coupled.contains(&touch.element) => {
            circuit.pins(touch.element).iter().all(|p| evidence.wiring.touching.only(p.node).is_some())
        }
        _ => is_opaque(circuit, touch.element),
    }
}

/// Folded names of nodes that formulas of unknown elements listen to: `v(a)`, `v(a,b)`.
fn mentioned_nodes(evidence: &Evidence<'_>) -> FxHashSet<String> {
    let mut names = FxHashSet::default();
    let mut seen = FxHashSet::default();
    for (id, element) in evidence.circuit.elements() {
        if !is_opaque(evidence.circuit, id) || !seen.insert(element.statement) {
            continue;
        }
        let text = evidence.sources.slice(element.statement).to_lowercase();
        for part in text.split("v(").skip(1) {
            let inside = part.split(')').next().unwrap_or("");
            names.extend(inside.split(',').map(|name| name.trim().to_owned()));
        }
    }
    names
}

/// Fills in which loose ends bear a name one slip away from another node of the same circuit or subcircuit.
fn find_slips(evidence: &Evidence<'_>, loose: &mut [LooseEnd]) {
    let circuit = evidence.circuit;
    if loose.is_empty() {
        return;
    }
    let place = |n: usize| circuit.nodes[n].scope;
    let name = |n: usize| circuit.text(circuit.nodes[n].name);
    let with_place = |n: usize| (n, place(n), name(n));
    let suspects = loose.iter().map(|end| end.node.index());
    let pairs = similar(suspects.map(with_place), (1..circuit.nodes.len()).map(with_place));
    let is_loose: FxHashSet<NodeId> = loose.iter().map(|end| end.node).collect();
    let mut meant_for: FxHashSet<NodeId> = FxHashSet::default();
    for end in loose.iter_mut() {
        let node = end.node.index();
        let folded = name(node).to_lowercase();
        if is_ground_slip(&folded) && place(node) == circuit.nodes[0].scope {
            end.meant = Some(NodeId::GROUND);
            continue;
        }
        let from = pairs.partition_point(|p| p.suspect < node);
        let options: Vec<NodeId> = pairs[from..]
            .iter()
            .take_while(|p| p.suspect == node)
            .map(|p| NodeId::new(p.known))
            .filter(|&known| {
                let shorted = circuit.pins(end.touch.element).iter().any(|p| p.node == known);
                // of a pair only the later one is told
                let mirrored = is_loose.contains(&known) && known > end.node;
                !(shorted || mirrored || is_series(&folded, &name(known.index()).to_lowercase()))
            })
            .collect();
        let lonely: Vec<NodeId> = options.iter().copied().filter(|n| is_loose.contains(n)).collect();
        end.meant = match (lonely.as_slice(), options.as_slice()) {
            ([one], _) | (_, [one]) => Some(*one),
            _ => None,
        };
        meant_for.extend(end.meant);
    }
    // the other half of a pair has the same cause
    for end in loose.iter_mut() {
        if meant_for.contains(&end.node) && end.meant.is_none() {
            end.meant = Some(end.node);
        }
    }
}

/// A slip in `gnd` itself; `o` for `0`.
fn is_ground_slip(name: &str) -> bool {
    name == "o" || name == "ground" || name == "grnd" || is_slip(name, "gnd")
}

/// Names that differ in their last letter only are as often a series (outa, outb) as a slip.
fn is_series(a: &str, b: &str) -> bool {
    let mut a = a.chars();
    let mut b = b.chars();
    a.next_back() != b.next_back() && a.as_str() == b.as_str()
}
