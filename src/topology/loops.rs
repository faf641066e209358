//! Closed walks along which every voltage is fixed: voltage sources, inductors and 0 Ω. A spanning forest holds
//! the fixed differences of potential; each element that closes a loop over it is one loop.

use super::decimal::{Sum, sum};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, Source};
use petgraph::unionfind::UnionFind;

/// An element on a walk.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Step {
    /// The element.
    pub element: ElementId,
    /// Walked from its first pin to its second.
    pub forward: bool,
}

/// A closed walk: the element that closes it first.
#[derive(Debug, Clone, PartialEq)]
pub struct Loop {
    /// Its elements in order.
    pub steps: Vec<Step>,
    /// The voltages at the operating point summed along the walk; not known where a controlled source takes part.
    pub sum: Sum,
}

/// A spanning forest over the elements that fix the voltage between their first two pins.
#[derive(Debug, Clone, Default)]
pub struct Potentials {
    tree: Vec<u32>,
    up: Vec<Option<Step>>,
    depth: Vec<u32>,
    closing: Vec<ElementId>,
}

/// Walks may be long and many; no more steps than this are listed for one circuit.
const MOST_STEPS: usize = 4_000_000;

/// How eagerly an element becomes part of the forest, `None` for one that fixes no voltage: sources first, so
/// that loops of sources alone are found as such.
fn rank(behaviour: &Behaviour) -> Option<usize> {
    match behaviour {
        Behaviour::VoltageSource(_) => Some(0),
        Behaviour::VoltageByVoltage { .. } | Behaviour::VoltageByCurrent { .. } => Some(1),
        Behaviour::Resistor(value) if value.number == 0.0 => Some(2),
        Behaviour::Inductor { .. } => Some(3),
        _ => None,
    }
}

/// The value of a source at the operating point, and whether it was written as a number: its DC value, else its
/// value at time zero, else 0.
pub fn dc_value(source: &Source) -> (f64, bool) {
    match (&source.dc, &source.shape) {
        (Some(value), _) => (value.number, value.written),
        (None, Some(shape)) => (shape.value(0.0), false),
        (None, None) => (0.0, true),
    }
}

/// Least and greatest value of a source over time.
pub fn span_of_values(source: &Source, stop: Option<f64>) -> (f64, f64) {
    let dc = dc_value(source).0;
    match &source.shape {
        None => (dc, dc),
        Some(shape) => {
            let (most, least) = shape.extremes(stop);
            (shape.value(least).min(dc), shape.value(most).max(dc))
        }
    }
}

impl Potentials {
    pub(super) fn of(circuit: &Circuit) -> Self {
        let count = circuit.nodes.len();
        let mut sets = UnionFind::<u32>::new(count);
        let mut kept = Vec::new();
        let mut closing = Vec::new();
        let mut by_rank: [Vec<ElementId>; 4] = Default::default();
        for (id, element) in circuit.elements() {
            if let Some(ids) = rank(&element.behaviour).and_then(|rank| by_rank.get_mut(rank)) {
                ids.push(id);
            }
        }
        for id in by_rank.into_iter().flatten() {
            let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
            if sets.union(a.0, b.0) {
                kept.push((a, b, id));
            } else if a != b {
                closing.push(id);
            }
        }
        let mut forest =
            Potentials { tree: vec![0; count], up: vec![None; count], depth: vec![0; count], closing };
        forest.root(&kept);
        forest
    }

    /// Directs the forest's edges towards the first node of each tree.
    fn root(&mut self, kept: &[(NodeId, NodeId, ElementId)]) {
        let count = self.up.len();
        let mut starts = vec![0u32; count + 1];
        for &(a, b, _) in kept {
            starts[a.index() + 1] += 1;
            starts[b.index() + 1] += 1;
        }
        for n in 1..starts.len() {
            starts[n] += starts[n - 1];
        }
        let mut next = starts.clone();
        let mut edges = vec![(0u32, Step { element: ElementId(0), forward: true }); 2 * kept.len()];
        for &(a, b, element) in kept {
            // seen from the far end: the step that leads back
            for (from, to, forward) in [(a, b, false), (b, a, true)] {
                edges[next[from.index()] as usize] = (to.0, Step { element, forward });
                next[from.index()] += 1;
            }
        }
        let mut seen = vec![false; count];
        let mut queue = Vec::new();
        for root in 0..count {
            if seen[root] {
                continue;
            }
            seen[root] = true;
            queue.push(root);
            while let Some(at) = queue.pop() {
                self.tree[at] = root as u32;
                for &(to, back) in &edges[starts[at] as usize..starts[at + 1] as usize] {
                    let to = to as usize;
                    if !seen[to] {
                        seen[to] = true;
                        self.up[to] = Some(back);
                        self.depth[to] = self.depth[at] + 1;
                        queue.push(to);
                    }
                }
            }
        }
    }

    /// The difference of potential of two nodes is fixed.
    pub fn joined(&self, a: NodeId, b: NodeId) -> bool {
        self.tree.get(a.index()) == self.tree.get(b.index())
    }

    /// The walk from `a` to `b` along the forest; `None` where there is none.
    pub fn walk(&self, circuit: &Circuit, a: NodeId, b: NodeId) -> Option<Vec<Step>> {
        if !self.joined(a, b) {
            return None;
        }
        let (mut left, mut right) = (a, b);
        let (mut steps, mut tail) = (Vec::new(), Vec::new());
        while left != right {
            if self.depth[left.index()] >= self.depth[right.index()] {
                let step = self.up[left.index()]?;
                steps.push(step);
                left = far_end(circuit, step.element, left);
            } else {
                let step = self.up[right.index()]?;
                tail.push(Step { forward: !step.forward, ..step });
                right = far_end(circuit, step.element, right);
            }
        }
        tail.reverse();
        steps.extend(tail);
        Some(steps)
    }
}

fn far_end(circuit: &Circuit, element: ElementId, from: NodeId) -> NodeId {
    let first = circuit.node(element, 0);
    if first == from { circuit.node(element, 1) } else { first }
}

/// The voltages along a walk, first end minus last, at the operating point.
pub fn total(circuit: &Circuit, steps: &[Step]) -> Sum {
    sum(steps.iter().map(|step| {
        let (value, written) = match &circuit.element(step.element).behaviour {
            Behaviour::VoltageSource(source) => dc_value(source),
            Behaviour::Resistor(_) | Behaviour::Inductor { .. } => (0.0, true),
            _ => (f64::NAN, false),
        };
        (if step.forward { value } else { -value }, written)
    }))
}

/// All loops but those of inductors and 0 Ω alone, which leave every voltage and every other current known.
pub(super) fn loops(circuit: &Circuit, potentials: &Potentials) -> Vec<Loop> {
    let is_short = |id: ElementId| rank(&circuit.element(id).behaviour).is_some_and(|r| r >= 2);
    let mut left = MOST_STEPS;
    let mut found = Vec::new();
    for &id in &potentials.closing {
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        let walk = potentials.walk(circuit, b, a).unwrap_or_default();
        if left < walk.len() {
            break;
        }
        left -= walk.len();
        let mut steps = vec![Step { element: id, forward: true }];
        steps.extend(walk);
        if !steps.iter().all(|s| is_short(s.element)) {
            found.push(Loop { sum: total(circuit, &steps), steps });
        }
    }
    found.sort_by_key(|l| l.steps[0].element);
    found
}
