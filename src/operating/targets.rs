//! The voltages whose error bars are wanted beside the diodes' currents: what notes watch, what controlled sources
//! listen to, and resistors between nodes that diodes pin. Only which; how uncertain they are is found with the case.

use super::assemble::{Assembly, NONE, Setting};
use super::result::{DifferenceOf, DifferenceResult, NodeResult};
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, Circuit, NodeId, NoteKind};
use crate::complementarity::{Place, Solution};

/// Differences at most that are looked at in one condition.
pub(crate) const MOST: usize = 64;

/// What is wanted, alike in all conditions.
#[derive(Debug, Clone, Default, PartialEq)]
pub(crate) struct Targets {
    /// Nodes against ground, in order.
    pub nodes: Vec<NodeId>,
    /// Differences, in the order of the text.
    pub pairs: Vec<(NodeId, NodeId, DifferenceOf)>,
}

impl Targets {
    /// Of a circuit.
    pub fn of(circuit: &Circuit, directory: Option<&Directory<'_>>) -> Self {
        let mut targets = Targets::default();
        for note in &circuit.notes {
            let (NoteKind::Watch { other, .. }, Some(directory)) = (&note.kind, directory) else { continue };
            let find = |name| directory.node(note.scope, circuit.text(name));
            match (find(note.subject), other.map(find)) {
                (Some(node), None) => targets.nodes.push(node),
                (Some(p), Some(Some(q))) if p != q => targets.pairs.push((p, q, DifferenceOf::Watched)),
                _ => {}
            }
        }
        targets.nodes.retain(|n| *n != NodeId::GROUND);
        targets.nodes.sort();
        targets.nodes.dedup();
        for (id, element) in circuit.elements() {
            let listens = match element.behaviour {
                Behaviour::VoltageByVoltage { gain } | Behaviour::CurrentByVoltage { gain } => {
                    gain.number != 0.0
                }
                _ => false,
            };
            let (p, q) = (circuit.node(id, 2), circuit.node(id, 3));
            if listens && p != q {
                targets.pairs.push((p, q, DifferenceOf::Control(id)));
            }
        }
        targets.pairs.truncate(MOST);
        targets
    }
}

/// A voltage above this is no mere difference of two drops of a kind.
const MOST_VOLTS: f64 = 0.5;

/// Resistors whose ends are both pinned by conducting diodes and that see less than a drop.
pub(crate) fn between_pinned(
    setting: &Setting<'_>,
    assembly: &Assembly,
    solution: &Solution,
) -> Vec<(NodeId, NodeId, DifferenceOf)> {
    let circuit = setting.circuit;
    let mut pinned = vec![false; circuit.nodes.len().max(1)];
    for diode in setting.diodes {
        let branch = assembly.branch[diode.element.index()] as usize;
        if matches!(solution.places.get(branch), Some(Place::Conducting | Place::Breakdown)) {
            for pin in 0..2 {
                pinned[circuit.node(diode.element, pin).index()] = true;
            }
        }
    }
    pinned[0] = false;
    let mut pairs = Vec::new();
    for (id, element) in circuit.elements() {
        let (p, q) = (circuit.node(id, 0), circuit.node(id, 1));
        if !matches!(element.behaviour, Behaviour::Resistor(_)) || p == q || pairs.len() >= MOST {
            continue;
        }
        let branch = assembly.branch[id.index()];
        let is_small = branch != NONE
            && solution.voltages[branch as usize].known().is_some_and(|v| v.abs() <= MOST_VOLTS);
        if is_small && pinned[p.index()] && pinned[q.index()] {
            pairs.push((p, q, DifferenceOf::Resistor(id)));
        }
    }
    pairs
}

/// The pairs that have a voltage and an error bar.
pub(crate) fn differences(
    pairs: &[(NodeId, NodeId, DifferenceOf)],
    errors: &[Option<f64>],
    nodes: &[NodeResult],
) -> Vec<DifferenceResult> {
    let known = |node: NodeId, of: fn(&NodeResult) -> Option<f64>| match node.index() {
        0 => Some(0.0),
        n => nodes.get(n - 1).and_then(of),
    };
    let difference = |(&(from, to, of), error): (&(NodeId, NodeId, DifferenceOf), &Option<f64>)| {
        let across = |what: fn(&NodeResult) -> Option<f64>| Some(known(from, what)? - known(to, what)?);
        let voltage = across(|n| n.voltage.known())?;
        Some(DifferenceResult { of, from, to, voltage, error: (*error)?, refined: across(|n| n.refined) })
    };
    pairs.iter().zip(errors).filter_map(difference).collect()
}
