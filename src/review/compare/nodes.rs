//! Which node of the old revision is which of the new: by the elements that touch it, so that renaming a node is no
//! change, and by its name where that leaves it open.

use super::matching::Pair;
use crate::circuit::{Circuit, NodeId};
use std::collections::BTreeMap;

/// Old nodes to new ones, one to one.
#[derive(Debug, Default)]
pub(super) struct Nodes {
    to_new: BTreeMap<NodeId, NodeId>,
}

impl Nodes {
    /// The new counterpart.
    pub fn get(&self, old: NodeId) -> Option<NodeId> {
        self.to_new.get(&old).copied()
    }

    pub fn iter(&self) -> impl Iterator<Item = (NodeId, NodeId)> + '_ {
        self.to_new.iter().map(|(&old, &new)| (old, new))
    }

    /// Lets the pins of the paired elements vote; a name in common is worth half a pin.
    pub fn vote(old: &Circuit, new: &Circuit, pairs: &[Pair]) -> Self {
        let mut votes: BTreeMap<(NodeId, NodeId), usize> = BTreeMap::new();
        for pair in pairs {
            for (a, b) in old.pins(pair.old).iter().zip(new.pins(pair.new)) {
                if (a.node == NodeId::GROUND) == (b.node == NodeId::GROUND) {
                    *votes.entry((a.node, b.node)).or_insert(0) += 2;
                }
            }
        }
        for (a, b) in same_names(old, new) {
            *votes.entry((a, b)).or_insert(0) += 1;
        }
        let mut ranked: Vec<(usize, NodeId, NodeId)> =
            votes.into_iter().map(|((a, b), n)| (n, a, b)).collect();
        ranked.sort_by_key(|&(votes, a, b)| (std::cmp::Reverse(votes), a, b));
        let mut nodes = Nodes::default();
        let mut taken = vec![false; new.nodes.len()];
        for (_, a, b) in [(0, NodeId::GROUND, NodeId::GROUND)].into_iter().chain(ranked) {
            if !taken[b.index()] && !nodes.to_new.contains_key(&a) {
                nodes.to_new.insert(a, b);
                taken[b.index()] = true;
            }
        }
        nodes
    }
}

fn same_names(old: &Circuit, new: &Circuit) -> Vec<(NodeId, NodeId)> {
    let all = |circuit: &Circuit| -> BTreeMap<String, NodeId> {
        let ids = (1..circuit.nodes.len()).map(NodeId::new);
        ids.map(|id| (circuit.node_name(id).to_lowercase(), id)).collect()
    };
    let new = all(new);
    all(old).into_iter().filter_map(|(name, id)| Some((id, *new.get(&name)?))).collect()
}
