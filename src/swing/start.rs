//! Where a part starts: from the operating point of the sources' values at the beginning, from given initial
//! voltages and currents, or with `uic` from those and nothing else.

use super::equations::Equations;
use super::run::Pass;
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::complementarity::stepping::{Drive, March};
use rustc_hash::FxHashMap;

/// How long storage that is free is given to settle, and how short a time what is held is given to move: windows.
const SETTLED: f64 = 1e9;
const HELD: f64 = 1e-9;

/// Voltages beyond so many times the largest source, and currents beyond this, are no operating point.
const WILD: f64 = 1e4;
const UNLIMITED: f64 = 1e6;

/// Brings the march to the start.
pub(super) fn settle(pass: &Pass<'_>, equations: &Equations, drive: &dyn Drive, march: &mut March) {
    let known = Known::new(pass);
    let given: Vec<Option<f64>> = equations.storage.iter().map(|&id| known.initial(pass, id)).collect();
    let from: Vec<f64> = given.iter().map(|g| g.unwrap_or(0.0)).collect();
    let is_free = pass.circuit.transient.is_none_or(|t| !t.uic);
    let mut states = from.clone();
    if is_free && given.iter().any(Option::is_none) {
        let window = pass.timing.window.1 - pass.timing.window.0;
        let lengths: Vec<f64> =
            given.iter().map(|g| window * if g.is_some() { HELD } else { SETTLED }).collect();
        let mut inputs = vec![0.0; equations.system.inputs];
        drive.at(pass.timing.first, &mut inputs);
        if let Some(found) = march.rest(&lengths, &from, &inputs) {
            states = found;
        }
    }
    let wild = WILD * (march.volts() + 1.0);
    for ((state, id), given) in states.iter_mut().zip(&equations.storage).zip(&given) {
        let is_coil = matches!(pass.circuit.element(*id).behaviour, Behaviour::Inductor { .. });
        let limit = if is_coil { UNLIMITED } else { wild };
        *state = given.unwrap_or(if state.abs() <= limit { *state } else { 0.0 });
    }
    march.place(states);
}

/// What the netlist says of node voltages at the beginning, and what sources are worth then.
struct Known {
    nodes: FxHashMap<NodeId, f64>,
    inputs: Vec<f64>,
}

impl Known {
    fn new(pass: &Pass<'_>) -> Self {
        let mut nodes = FxHashMap::default();
        for &(node, volts) in &pass.circuit.initial {
            nodes.entry(node).or_insert(volts);
        }
        let inputs = if nodes.is_empty() {
            Vec::new()
        } else {
            pass.given.shapes.iter().map(|shape| shape.value(pass.timing.first)).collect()
        };
        Known { nodes, inputs }
    }

    /// What the netlist says of a storage element's voltage or current at the beginning.
    fn initial(&self, pass: &Pass<'_>, id: ElementId) -> Option<f64> {
        match pass.circuit.element(id).behaviour {
            Behaviour::Inductor { initial, .. } => initial,
            Behaviour::Capacitor { initial: Some(volts), .. } => Some(volts),
            Behaviour::Capacitor { .. } => {
                let (plus, minus) = (pass.circuit.node(id, 0), pass.circuit.node(id, 1));
                let known = |node: NodeId| self.nodes.get(&node).copied();
                let held =
                    |node: NodeId| Some(pass.given.held.get(node.index())?.as_ref()?.at(&[], &self.inputs));
                let (from_plus, from_minus) = (known(plus), known(minus));
                if from_plus.is_none() && from_minus.is_none() {
                    return None;
                }
                Some(from_plus.or_else(|| held(plus))? - from_minus.or_else(|| held(minus))?)
            }
            _ => None,
        }
    }
}
