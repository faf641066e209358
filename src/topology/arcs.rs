//! Currents that must go one way. Everything but diodes without breakdown and bipolar transistors passes current both
//! ways and is contracted; what is left is a directed graph of these. A diode whose ends lie in different strongly
//! connected components of it lies in no directed loop but in a directed cut, so it never carries forward
//! current whatever the values are (colouring lemma: Minty 1960).

use super::adjacent::Adjacent;
use super::groups::{Groups, Joints};
use super::links::arcs;
use super::touching::Touching;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};

/// What one-way diodes make of the rest.
#[derive(Debug, Clone, Default)]
pub struct OneWay {
    /// Nodes joined by what passes current both ways.
    pub two_way: Groups,
    /// Diodes that no closed path lets conduct, in order.
    pub barred: Vec<Barred>,
    /// Component of ground.
    pub ground: u32,
    /// Component of each group.
    pub component: Vec<u32>,
}

/// A diode that no closed path lets conduct.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Barred {
    /// The diode.
    pub diode: ElementId,
    /// Component of its anode and of its cathode: joined by directed cuts.
    pub components: (u32, u32),
    /// It is the only link to a dead end (a bridge): no current of either direction could close its path.
    pub dead_end: bool,
    /// In that dead end some node has one connection only.
    pub loose_end: bool,
}

impl OneWay {
    /// Of currents of any kind, or of lasting ones only (`steady`): those find no way through a capacitor or a gate.
    /// Means of periodic currents obey the same law as lasting ones, since no capacitor carries a mean current.
    pub(super) fn of(circuit: &Circuit, joints: &Joints, touching: &Touching, steady: bool) -> Self {
        let two_way = joints.two_way(steady);
        let mut graph: DiGraph<(), ElementId> = DiGraph::with_capacity(two_way.count(), 0);
        for _ in 0..two_way.count() {
            graph.add_node(());
        }
        for (id, _) in circuit.elements() {
            for (from, to) in arcs(circuit, id, joints.available) {
                graph.add_edge(NodeIndex::new(two_way.of(from)), NodeIndex::new(two_way.of(to)), id);
            }
        }
        let mut component = vec![0u32; two_way.count()];
        for (number, members) in kosaraju_scc(&graph).iter().enumerate() {
            for member in members {
                component[member.index()] = number as u32;
            }
        }
        let loose = loose_ends(circuit, touching, &two_way);
        let bridges = Bridges::of(&graph, &loose, two_way.of(NodeId::GROUND));
        let barred = graph
            .edge_indices()
            .filter_map(|edge| {
                let (from, to) = graph.edge_endpoints(edge)?;
                let components = (component[from.index()], component[to.index()]);
                let (dead_end, loose_end) = bridges.verdict[edge.index()];
                let is_diode = matches!(circuit.element(graph[edge]).behaviour, Behaviour::Diode { .. });
                (is_diode && components.0 != components.1).then(|| Barred {
                    diode: graph[edge],
                    components,
                    dead_end,
                    loose_end,
                })
            })
            .collect();
        OneWay { ground: component[two_way.of(NodeId::GROUND)], two_way, barred, component }
    }
}

/// How many nodes of each group have one connection only.
fn loose_ends(circuit: &Circuit, touching: &Touching, groups: &Groups) -> Vec<u32> {
    let mut loose = vec![0; groups.count()];
    for n in 1..circuit.nodes.len() {
        let node = NodeId::new(n);
        if touching.only_joining(node).is_some() {
            loose[groups.of(node)] += 1;
        }
    }
    loose
}

/// Edges whose removal parts the graph, directions ignored; parallel edges are told apart by their numbers.
struct Bridges {
    /// For each edge: it is a bridge, and beyond it, away from ground, there are loose ends (anywhere, where there is no
    /// ground to be away from).
    verdict: Vec<(bool, bool)>,
}

impl Bridges {
    /// Depth-first search with the least entry number that a subtree reaches (Tarjan 1974), without recursion.
    fn of(graph: &DiGraph<(), ElementId>, loose: &[u32], ground: usize) -> Self {
        let count = graph.node_count();
        let ends =
            |edge| graph.edge_endpoints(edge).map_or((0, 0), |(a, b)| (a.index() as u32, b.index() as u32));
        let adjacent = Adjacent::of(count, graph.edge_indices().map(ends));
        let mut verdict = vec![(false, false); graph.edge_count()];
        let mut entry = vec![u32::MAX; count];
        let mut low = vec![u32::MAX; count];
        let mut beyond = loose.to_vec();
        let mut clock = 0;
        // node, the edge that led here, next neighbour to look at
        let mut stack: Vec<(usize, u32, usize)> = Vec::new();
        for root in std::iter::once(ground).chain(0..count) {
            if entry[root] != u32::MAX {
                continue;
            }
            stack.push((root, u32::MAX, 0));
            let mut found = Vec::new();
            while let Some(&mut (at, by, ref mut next)) = stack.last_mut() {
                if entry[at] == u32::MAX {
                    entry[at] = clock;
                    low[at] = clock;
                    clock += 1;
                }
                if let Some(&(to, edge)) = adjacent.of_node(at).get(*next) {
                    *next += 1;
                    let to = to as usize;
                    if edge == by {
                    } else if entry[to] == u32::MAX {
                        stack.push((to, edge, 0));
                    } else {
                        low[at] = low[at].min(entry[to]);
                    }
                    continue;
                }
                stack.pop();
                if let Some(&(parent, _, _)) = stack.last() {
                    low[parent] = low[parent].min(low[at]);
                    beyond[parent] += beyond[at];
                    if low[at] > entry[parent] {
                        verdict[by as usize] = (true, beyond[at] > 0);
                        found.push(by);
                    }
                }
            }
            // which side is beyond must not depend on the node that happens to be written first
            if root != ground {
                found.into_iter().for_each(|edge| verdict[edge as usize].1 = beyond[root] > 0);
            }
        }
        Bridges { verdict }
    }
}
