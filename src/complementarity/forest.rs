//! Groups of nodes whose potentials are tied by branches of fixed voltage: a spanning forest with the offset of
//! every node from its root. Used for sources and shorts, and again for junctions that conduct.

use super::double_double::Dd;

/// A branch of fixed voltage: potential of `a` minus that of `b`.
#[derive(Debug, Clone, Copy)]
pub(super) struct Tie {
    pub(super) a: u32,
    pub(super) b: u32,
    pub(super) volts: Dd,
}

/// The forest. `order` lists nodes so that a parent comes before its children.
#[derive(Debug, Clone)]
pub(super) struct Forest {
    /// Group of each node; groups are numbered by their first node, so node 0 is in group 0.
    pub(super) group: Vec<u32>,
    /// Number of groups.
    pub(super) groups: usize,
    /// Potential of each node above that of its group's root.
    pub(super) offset: Vec<Dd>,
    /// Tie that leads to the parent, `u32::MAX` at roots.
    pub(super) up: Vec<u32>,
    /// Parent of each node; itself at roots.
    pub(super) parent: Vec<u32>,
    /// Nodes, parents first.
    pub(super) order: Vec<u32>,
    /// Ties that close a loop, in order.
    pub(super) chords: Vec<u32>,
}

pub(super) const NONE: u32 = u32::MAX;

impl Forest {
    /// Earlier ties are preferred for the forest.
    pub(super) fn new(nodes: usize, ties: &[Tie]) -> Self {
        let mut set = Sets::new(nodes);
        let mut chords = Vec::new();
        let mut tree = Vec::new();
        for (n, tie) in ties.iter().enumerate() {
            if set.union(tie.a, tie.b) { tree.push(n as u32) } else { chords.push(n as u32) }
        }
        let near = Adjacency::new(nodes, tree.iter().map(|&n| (ties[n as usize].a, ties[n as usize].b)));
        let mut forest = Forest {
            group: vec![NONE; nodes],
            groups: 0,
            offset: vec![Dd::ZERO; nodes],
            up: vec![NONE; nodes],
            parent: (0..nodes as u32).collect(),
            order: Vec::with_capacity(nodes),
            chords,
        };
        for root in 0..nodes as u32 {
            if forest.group[root as usize] == NONE {
                forest.grow(root, ties, &tree, &near);
            }
        }
        forest
    }

    fn grow(&mut self, root: u32, ties: &[Tie], tree: &[u32], near: &Adjacency) {
        let group = self.groups as u32;
        self.groups += 1;
        self.group[root as usize] = group;
        let mut at = self.order.len();
        self.order.push(root);
        while at < self.order.len() {
            let node = self.order[at];
            at += 1;
            for &(edge, other) in near.of(node) {
                if self.group[other as usize] != NONE {
                    continue;
                }
                let number = tree[edge as usize];
                let tie = &ties[number as usize];
                let step = if tie.a == other { tie.volts } else { -tie.volts };
                self.group[other as usize] = group;
                self.offset[other as usize] = self.offset[node as usize] + step;
                self.up[other as usize] = number;
                self.parent[other as usize] = node;
                self.order.push(other);
            }
        }
    }

    /// Ties on the way from `from` to `to` in one group, each with +1 where it is walked from `a` to `b`.
    pub(super) fn walk(&self, ties: &[Tie], from: u32, to: u32) -> Vec<(u32, f64)> {
        let depth = |mut node: u32| {
            let mut steps = 0;
            while self.up[node as usize] != NONE {
                node = self.parent[node as usize];
                steps += 1;
            }
            steps
        };
        let (mut a, mut b, mut da, mut db) = (from, to, depth(from), depth(to));
        let (mut head, mut tail) = (Vec::new(), Vec::new());
        while a != b && (da > 0 || db > 0) {
            if da >= db {
                let tie = self.up[a as usize];
                head.push((tie, if ties[tie as usize].a == a { 1.0 } else { -1.0 }));
                a = self.parent[a as usize];
                da -= 1;
            } else {
                let tie = self.up[b as usize];
                tail.push((tie, if ties[tie as usize].b == b { 1.0 } else { -1.0 }));
                b = self.parent[b as usize];
                db -= 1;
            }
        }
        head.extend(tail.into_iter().rev());
        head
    }
}

/// Union-find with path halving.
#[derive(Debug, Clone)]
pub(super) struct Sets {
    parent: Vec<u32>,
}

impl Sets {
    pub(super) fn new(nodes: usize) -> Self {
        Sets { parent: (0..nodes as u32).collect() }
    }

    pub(super) fn find(&mut self, mut node: u32) -> u32 {
        while self.parent[node as usize] != node {
            let up = self.parent[node as usize];
            self.parent[node as usize] = self.parent[up as usize];
            node = self.parent[node as usize];
        }
        node
    }

    /// The smaller root wins, so that node 0 represents its set. `false` where they were one already.
    pub(super) fn union(&mut self, a: u32, b: u32) -> bool {
        let (a, b) = (self.find(a), self.find(b));
        if a == b {
            return false;
        }
        self.parent[a.max(b) as usize] = a.min(b);
        true
    }
}

/// Edges at each node: `(edge, other end)`, in the order of the edges.
#[derive(Debug, Clone)]
pub(super) struct Adjacency {
    start: Vec<u32>,
    near: Vec<(u32, u32)>,
}

impl Adjacency {
    pub(super) fn new(nodes: usize, edges: impl Iterator<Item = (u32, u32)> + Clone) -> Self {
        let mut start = vec![0u32; nodes + 1];
        for (a, b) in edges.clone() {
            start[a as usize + 1] += 1;
            if a != b {
                start[b as usize + 1] += 1;
            }
        }
        for n in 0..nodes {
            start[n + 1] += start[n];
        }
        let mut next = start.clone();
        let mut near = vec![(0, 0); start[nodes] as usize];
        for (n, (a, b)) in edges.enumerate() {
            near[next[a as usize] as usize] = (n as u32, b);
            next[a as usize] += 1;
            if a != b {
                near[next[b as usize] as usize] = (n as u32, a);
                next[b as usize] += 1;
            }
        }
        Adjacency { start, near }
    }

    pub(super) fn of(&self, node: u32) -> &[(u32, u32)] {
        &self.near[self.start[node as usize] as usize..self.start[node as usize + 1] as usize]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn offsets_and_walks_agree() {
        let ties = [
            Tie { a: 1, b: 0, volts: Dd::from(5.0) },
            Tie { a: 2, b: 1, volts: Dd::from(-2.0) },
            Tie { a: 2, b: 0, volts: Dd::from(3.0) },
            Tie { a: 4, b: 3, volts: Dd::from(1.0) },
        ];
        let forest = Forest::new(5, &ties);
        assert_eq!(forest.groups, 2);
        assert_eq!(forest.chords, [2]);
        assert_eq!(forest.offset[2].round(), 3.0);
        let sum: f64 =
            forest.walk(&ties, 2, 0).iter().map(|(t, s)| s * ties[*t as usize].volts.round()).sum();
        assert_eq!(sum, 3.0);
        let sum: f64 =
            forest.walk(&ties, 0, 2).iter().map(|(t, s)| s * ties[*t as usize].volts.round()).sum();
        assert_eq!(sum, -3.0);
    }
}
