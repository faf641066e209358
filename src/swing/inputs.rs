//! What is given from outside: moving sources as inputs, and the nodes that chains of voltage sources hold.

use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, Shape};
use crate::complementarity::stepping::Affine;
use crate::operating::Basis;
use rustc_hash::FxHashSet;

/// Moving sources in series up to which a node counts as held: each node of a stack has a term for every source below
/// it, so that longer ones would take memory and time by the square of their length.
const MOST_STACKED: usize = 64;

/// The inputs and the held nodes of a circuit.
pub(super) struct Given<'a> {
    circuit: &'a Circuit,
    basis: &'a Basis,
    /// The moving sources, in order; their numbers are those of the inputs.
    pub shapes: Vec<&'a Shape>,
    /// Potential of each node that sources hold against ground, over all inputs.
    pub held: Vec<Option<Affine>>,
    /// Voltage sources that are used up for that, by element number.
    pub is_boundary: Vec<bool>,
}

impl<'a> Given<'a> {
    pub fn new(circuit: &'a Circuit, basis: &'a Basis) -> Self {
        let shape = |&id: &ElementId| basis.source(circuit, id).and_then(|s| s.shape.as_ref());
        let mut given = Given {
            circuit,
            basis,
            shapes: basis.plan.moving.iter().filter_map(shape).collect(),
            held: vec![None; circuit.nodes.len().max(1)],
            is_boundary: vec![false; circuit.elements.len()],
        };
        given.hold();
        given
    }

    /// Value of an independent source.
    pub fn source(&self, id: ElementId) -> Affine {
        if let Ok(input) = self.basis.plan.moving.binary_search(&id) {
            return Affine { inputs: vec![(input as u32, 1.0)], ..Affine::default() };
        }
        let place = self.basis.plan.sources.binary_search(&id).ok();
        let level = place.and_then(|n| self.basis.nominal()?.sources.get(n));
        Affine { constant: level.map_or(0.0, |l| l.value), ..Affine::default() }
    }

    /// Follows voltage sources from ground, those aside whose current somebody listens to, and what is behind a long
    /// stack of them: it is solved for like any other part.
    fn hold(&mut self) {
        let circuit = self.circuit;
        let listened: FxHashSet<ElementId> =
            circuit.elements.iter().filter_map(|e| listens_to(&e.behaviour)).collect();
        let mut around: Vec<Vec<(NodeId, Affine, Option<ElementId>)>> = vec![Vec::new(); self.held.len()];
        let none = Affine::default();
        for &id in &self.basis.plan.sources {
            if !matches!(circuit.element(id).behaviour, Behaviour::VoltageSource(_)) || listened.contains(&id)
            {
                continue;
            }
            let (plus, minus, value) = (circuit.node(id, 0), circuit.node(id, 1), self.source(id));
            around[minus.index()].push((plus, value.clone(), Some(id)));
            around[plus.index()].push((minus, none.minus(&value), Some(id)));
        }
        if let Some(nominal) = self.basis.nominal() {
            for (supply, level) in self.basis.plan.supplies.iter().zip(&nominal.supplies) {
                let value = Affine { constant: level.value, ..Affine::default() };
                around[0].push((supply.node, value, None));
            }
        }
        self.held[0] = Some(Affine::default());
        let mut open = vec![NodeId::GROUND];
        while let Some(node) = open.pop() {
            let Some(here) = self.held[node.index()].clone() else { continue };
            for (next, rise, source) in std::mem::take(&mut around[node.index()]) {
                if self.held[next.index()].is_none() {
                    let there = here.minus(&none.minus(&rise));
                    if there.inputs.len() > MOST_STACKED {
                        continue;
                    }
                    self.held[next.index()] = Some(there);
                    open.push(next);
                }
                if let Some(id) = source {
                    self.is_boundary[id.index()] = true;
                }
            }
        }
    }

    /// Whether a potential difference is given from outside.
    pub fn difference(&self, plus: NodeId, minus: NodeId) -> Option<Affine> {
        let (a, b) = (self.held.get(plus.index())?.as_ref()?, self.held.get(minus.index())?.as_ref()?);
        Some(a.minus(b))
    }
}

/// The element whose current this one follows.
pub(super) fn listens_to(behaviour: &Behaviour) -> Option<ElementId> {
    match behaviour {
        Behaviour::VoltageByCurrent { control, .. } | Behaviour::CurrentByCurrent { control, .. } => *control,
        _ => None,
    }
}
