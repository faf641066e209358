//! A stage of a diode pump that has no capacitor.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::gives_light;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "unstored-stage",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a stage of a voltage multiplier or charge pump has no capacitor",
    why: "Each stage of a pump passes on what its capacitor stored in the half-wave before. A stage without one adds \
          nothing, and the two diodes around it are just two drops in series; at the output the load then sees pulses.",
    remedy: "Put the capacitor of this stage in, or take out one of the two diodes.",
    source: Some(
        "Diode-capacitor multiplier: J. D. Cockcroft and E. T. S. Walton, Proc. R. Soc. Lond. A 136 (1932) 619-630",
    ),
    failing: "tide gauge buoy: bias of the hydrophone\n\
              V1 drv 0 SIN(0 12 20k)\n\
              R1 drv in 22\n\
              C1 in a1 47n\n\
              D1 0 a1 DSIG\n\
              D2 a1 b1 DSIG\n\
              C2 b1 0 47n\n\
              D3 b1 a2 DSIG\n\
              D4 a2 b2 DSIG\n\
              C4 b2 b1 47n\n\
              RL b2 0 4.7meg\n\
              .model DSIG D(IS=2.5n N=1.75 RS=0.5)\n",
    passing: "tide gauge buoy: temperature sensor of three diodes\n\
              V1 vcc 0 5\n\
              R1 vcc t3 10k\n\
              D3 t3 t2 DSIG\n\
              D2 t2 t1 DSIG\n\
              D1 t1 0 DSIG\n\
              C1 t3 0 100n\n\
              .model DSIG D(IS=2.5n N=1.75 RS=0.5)\n",
    check: Check::Wiring(check),
};

/// Shorter chains are no multipliers of several stages.
const LEAST: usize = 3;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let mut seen: FxHashSet<ElementId> = FxHashSet::default();
    let mut findings = Vec::new();
    for (id, element) in evidence.circuit.elements() {
        if !matches!(element.behaviour, Behaviour::Diode { .. }) || seen.contains(&id) {
            continue;
        }
        let chain = chain_through(evidence, id);
        seen.extend(&chain);
        if chain.len() >= LEAST {
            findings.extend(judge(evidence, &chain));
        }
    }
    findings
}

/// The chain of diodes, each cathode at the next one's anode and at no other diode, of which `id` is one.
fn chain_through(evidence: &Evidence<'_>, id: ElementId) -> Vec<ElementId> {
    let mut chain = vec![id];
    while let Some(next) = neighbour(evidence, chain[chain.len() - 1], 1).filter(|n| !chain.contains(n)) {
        chain.push(next);
    }
    chain.reverse();
    while let Some(before) = neighbour(evidence, chain[chain.len() - 1], 0).filter(|n| !chain.contains(n)) {
        chain.push(before);
    }
    chain.reverse();
    chain
}

/// The diode that goes on at one end, where just one other diode is and points the same way.
fn neighbour(evidence: &Evidence<'_>, id: ElementId, pin: u32) -> Option<ElementId> {
    let circuit = evidence.circuit;
    let node = circuit.node(id, pin as usize);
    if evidence.wiring.rails.is_rail(node) {
        return None;
    }
    let is_diode = |other: ElementId| matches!(circuit.element(other).behaviour, Behaviour::Diode { .. });
    let touches = evidence.wiring.touching.at(node).iter();
    let mut others = touches.filter(|t| t.element != id && is_diode(t.element));
    match (others.next(), others.next()) {
        // lamps and other kinds of diode are no stages of the pump
        (Some(other), None) if other.pin == 1 - pin => {
            let alike = evidence.model_name(other.element) == evidence.model_name(id);
            Some(other.element).filter(|&o| alike && !gives_light(circuit, o))
        }
        _ => None,
    }
}

fn judge(evidence: &Evidence<'_>, chain: &[ElementId]) -> Option<Finding> {
    let circuit = evidence.circuit;
    // the nodes after each diode: what is pumped
    let nodes: Vec<NodeId> = chain.iter().map(|&id| circuit.node(id, 1)).collect();
    let stores: Vec<bool> = nodes.iter().map(|&n| has_capacitor(evidence, n)).collect();
    let stored = stores.iter().filter(|&&s| s).count();
    if stored < 2 || !is_pumped(evidence, &nodes) {
        return None;
    }
    if let Some(gap) = gap(evidence, chain) {
        return Some(broken_ladder(evidence, chain, gap));
    }
    let is_bare = |n: usize| match n + 1 == nodes.len() {
        // the last one is the output
        true => is_loaded_only(evidence, chain[n], nodes[n]),
        false => evidence.wiring.touching.at(nodes[n]).len() == 2 && stores[n..].contains(&true),
    };
    let n = (0..nodes.len()).find(|&n| !stores[n] && is_bare(n))?;
    let node = evidence.node(nodes[n]);
    let around: Vec<String> = chain[n..].iter().take(2).map(|&id| evidence.name(id)).collect();
    let message = format!(
        "the stage at `{node}` ({}) has no capacitor, though {stored} others of the chain have",
        list(&around)
    );
    let mut finding =
        evidence.about(&RULE, chain[n], message).label("nothing is stored behind it").about(node);
    if let Some(&next) = chain.get(n + 1) {
        finding =
            finding.also(evidence.statement(next), "takes what should be stored").about(evidence.name(next));
    }
    evidence.name_nodes(&mut finding, &chain[n..chain.len().min(n + 2)]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// Nothing but resistors to ground is there beside the diode.
fn is_loaded_only(evidence: &Evidence<'_>, diode: ElementId, node: NodeId) -> bool {
    let circuit = evidence.circuit;
    let is_load = |id: ElementId| {
        let ends = [circuit.node(id, 0), circuit.node(id, 1)];
        matches!(circuit.element(id).behaviour, Behaviour::Resistor(_)) && ends.contains(&NodeId::GROUND)
    };
    let touches = evidence.wiring.touching.at(node);
    !evidence.wiring.rails.is_rail(node) && touches.iter().all(|t| t.element == diode || is_load(t.element))
}

/// In a ladder a capacitor joins each node of the chain to the next but one; the first pair without one, counted from the
/// anode of the first diode, where most pairs have it.
fn gap(evidence: &Evidence<'_>, chain: &[ElementId]) -> Option<(NodeId, NodeId)> {
    let circuit = evidence.circuit;
    let first = std::iter::once(circuit.node(*chain.first()?, 0));
    let nodes: Vec<NodeId> = first.chain(chain.iter().map(|&id| circuit.node(id, 1))).collect();
    let pairs: Vec<(NodeId, NodeId)> = nodes.windows(3).map(|w| (w[0], w[2])).collect();
    let is_joined = |pair: &&(NodeId, NodeId)| capacitors(evidence, pair.1).any(|far| far == pair.0);
    let joined = pairs.iter().filter(is_joined).count();
    // a capacitor to ground smooths as well
    let smooths = |pair: &&(NodeId, NodeId)| {
        capacitors(evidence, pair.1).any(|far| far == NodeId::GROUND || far == pair.0)
    };
    let missing: Vec<_> = pairs.iter().filter(|pair| !smooths(pair)).collect();
    match missing.as_slice() {
        [one] if joined >= 3 => Some(**one),
        _ => None,
    }
}

fn broken_ladder(evidence: &Evidence<'_>, chain: &[ElementId], (lower, upper): (NodeId, NodeId)) -> Finding {
    let circuit = evidence.circuit;
    let (lower_name, upper_name) = (evidence.node(lower), evidence.node(upper));
    let at = chain.iter().copied().find(|&id| circuit.node(id, 1) == upper).unwrap_or(chain[0]);
    let message = format!(
        "no capacitor joins `{lower_name}` and `{upper_name}`, though all other stages of the ladder have theirs"
    );
    let mut finding = evidence.about(&RULE, at, message).label("charges a node that stores nothing");
    finding
        .subjects
        .extend([lower, upper].iter().filter(|&&n| n != NodeId::GROUND).map(|&n| evidence.node(n)));
    evidence.name_nodes(&mut finding, &[at]);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}

fn capacitors<'e>(evidence: &'e Evidence<'_>, node: NodeId) -> impl Iterator<Item = NodeId> + 'e {
    let circuit: &Circuit = evidence.circuit;
    let touches = evidence.wiring.touching.at(node).iter();
    touches.filter_map(move |t| match circuit.element(t.element).behaviour {
        Behaviour::Capacitor { .. } => Some(circuit.node(t.element, 1 - t.pin.min(1) as usize)),
        _ => None,
    })
}

fn has_capacitor(evidence: &Evidence<'_>, node: NodeId) -> bool {
    capacitors(evidence, node).any(|far| far != node)
}

/// What moves reaches the chain through a capacitor.
fn is_pumped(evidence: &Evidence<'_>, nodes: &[NodeId]) -> bool {
    let is_end =
        |n: &NodeId| *n != NodeId::GROUND && evidence.wiring.driven.iter().any(|d| d.ends.contains(n));
    nodes.iter().any(|n| is_end(n) || capacitors(evidence, *n).any(|far| is_end(&far)))
}
