//! Blocks: the largest sets of elements of which any two lie on a common loop. No current flows between two blocks that
//! touch in one node, so a block without a source carries none at all, and an element that is a block of its own (a
//! bridge) carries none either.

use super::adjacent::Adjacent;
use super::cuts::coupled_coils;
use super::links::{is_opaque, links};
use super::noted::Noted;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};

/// A block of two or more elements in which nothing drives a current.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Unfed {
    /// Its elements, in order.
    pub elements: Vec<ElementId>,
    /// Its nodes, in order, ground among them where it touches it.
    pub nodes: Vec<NodeId>,
}

/// One edge of the graph: an element, or a `supply` note.
#[derive(Clone, Copy)]
struct Edge {
    ends: (u32, u32),
    element: Option<ElementId>,
}

/// All blocks without a source.
pub(super) fn unfed(circuit: &Circuit, noted: &Noted) -> Vec<Unfed> {
    let mut edges = Vec::new();
    for (id, _) in circuit.elements() {
        for (a, b) in ways(circuit, id) {
            let ends = (circuit.node(id, a).0, circuit.node(id, b).0);
            if ends.0 != ends.1 {
                edges.push(Edge { ends, element: Some(id) });
            }
        }
        // what is not known may be joined to ground inside
        if is_opaque(circuit, id) && circuit.node(id, 0) != NodeId::GROUND {
            edges.push(Edge { ends: (circuit.node(id, 0).0, 0), element: Some(id) });
        }
    }
    for &node in noted.supplied.iter().filter(|&&n| n != NodeId::GROUND) {
        edges.push(Edge { ends: (node.0, 0), element: None });
    }
    let coils = coupled_coils(circuit);
    let drives = |edge: &Edge| match edge.element {
        None => true,
        Some(id) => match &circuit.element(id).behaviour {
            Behaviour::VoltageSource(_)
            | Behaviour::CurrentSource(_)
            | Behaviour::VoltageByVoltage { .. }
            | Behaviour::VoltageByCurrent { .. }
            | Behaviour::CurrentByVoltage { .. }
            | Behaviour::CurrentByCurrent { .. }
            | Behaviour::Unknown { .. } => true,
            Behaviour::Capacitor { initial, .. } => initial.is_some(),
            Behaviour::Inductor { initial, .. } => initial.is_some() || coils.contains(&id),
            _ => false,
        },
    };
    let is_unfed = |block: &Vec<u32>| block.len() > 1 && !block.iter().any(|&e| drives(&edges[e as usize]));
    let mut found: Vec<Unfed> = blocks(circuit.nodes.len().max(1), &edges)
        .into_iter()
        .filter(is_unfed)
        .map(|block| {
            let edge = |e: &u32| edges[*e as usize];
            let mut elements: Vec<ElementId> = block.iter().filter_map(|e| edge(e).element).collect();
            let ends = block.iter().map(|e| edge(e).ends);
            let mut nodes: Vec<NodeId> = ends.flat_map(|(a, b)| [NodeId(a), NodeId(b)]).collect();
            elements.sort();
            elements.dedup();
            nodes.sort();
            nodes.dedup();
            Unfed { elements, nodes }
        })
        .filter(|unfed| unfed.elements.len() > 1 && !is_lone_junction(circuit, &unfed.elements))
        .collect();
    found.sort_by(|a, b| a.elements.cmp(&b.elements));
    found
}

/// One bipolar transistor and resistors only: the loop of its base, whatever its collector does.
fn is_lone_junction(circuit: &Circuit, elements: &[ElementId]) -> bool {
    let is_resistor = |id: &ElementId| matches!(circuit.element(*id).behaviour, Behaviour::Resistor(_));
    let others: Vec<&ElementId> = elements.iter().filter(|id| !is_resistor(id)).collect();
    matches!(others.as_slice(), [one] if circuit.element(**one).letter == b'Q')
}

/// The pins between which an element passes what a source drives. The junction from base to collector is there, but
/// nothing is fed through it: what hangs on a collector alone has no other feed than the emitter.
fn ways(circuit: &Circuit, id: ElementId) -> Vec<(usize, usize)> {
    let element = circuit.element(id);
    if matches!(element.behaviour, Behaviour::Transistor { .. }) && element.letter != b'M' {
        return [(0, 2), (1, 2), (2, 3)].into_iter().filter(|w| w.1 < circuit.pins(id).len()).collect();
    }
    links(circuit, id).map(|(a, b, _)| (a, b)).collect()
}

/// The blocks as lists of edge numbers: depth-first search with the least entry number that a subtree reaches (Hopcroft
/// and Tarjan 1973), without recursion; parallel edges are told apart by their numbers.
fn blocks(count: usize, edges: &[Edge]) -> Vec<Vec<u32>> {
    let around = Adjacent::of(count, edges.iter().map(|edge| edge.ends));
    let mut entry = vec![u32::MAX; count];
    let mut low = vec![u32::MAX; count];
    let mut clock = 0;
    let mut kept: Vec<u32> = Vec::new();
    let mut found = Vec::new();
    // node, the edge that led here, next neighbour to look at
    let mut stack: Vec<(usize, u32, usize)> = Vec::new();
    for root in 0..count {
        if entry[root] != u32::MAX {
            continue;
        }
        stack.push((root, u32::MAX, 0));
        while let Some(&mut (at, by, ref mut next)) = stack.last_mut() {
            if entry[at] == u32::MAX {
                entry[at] = clock;
                low[at] = clock;
                clock += 1;
            }
            if let Some(&(to, edge)) = around.of_node(at).get(*next) {
                *next += 1;
                let to = to as usize;
                if edge == by {
                } else if entry[to] == u32::MAX {
                    kept.push(edge);
                    stack.push((to, edge, 0));
                } else if entry[to] < entry[at] {
                    kept.push(edge);
                    low[at] = low[at].min(entry[to]);
                }
                continue;
            }
            stack.pop();
            let Some(&(parent, _, _)) = stack.last() else { continue };
            low[parent] = low[parent].min(low[at]);
            if low[at] >= entry[parent] {
                let from = kept.iter().rposition(|&e| e == by).unwrap_or(0);
                found.push(kept.split_off(from));
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    // by hand: a triangle, a bridge, and two edges side by side
    #[test]
    fn loops_that_meet_in_one_node_are_blocks_of_their_own() {
        let edge = |a, b| Edge { ends: (a, b), element: None };
        let edges = [edge(0, 1), edge(1, 2), edge(2, 0), edge(2, 3), edge(3, 4), edge(3, 4)];
        let mut found = blocks(5, &edges);
        found.iter_mut().for_each(|b| b.sort_unstable());
        found.sort();
        assert_eq!(found, [vec![0, 1, 2], vec![3], vec![4, 5]]);
    }
}
