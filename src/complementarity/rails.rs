//! Nodes tied together by sources and shorts, and the contradictions among those ties. What is tied to the
//! reference is a boundary between parts.

use super::decimal::sign_of_sum;
use super::forest::{Forest, NONE, Tie};
use super::network::{Law, Level, Network};
use super::outcome::{Part, Reason, Verdict};
use std::cmp::Ordering;

/// The ties of a network.
pub(super) struct Rails {
    pub(super) forest: Forest,
    pub(super) ties: Vec<Tie>,
    /// Branch of each tie.
    pub(super) branch: Vec<u32>,
    /// Nodes whose potential rests on sources that contradict each other.
    pub(super) tainted: Vec<bool>,
    /// A part for each contradiction.
    pub(super) contradictions: Vec<Part>,
    /// Some loop of ties agrees: its current is open.
    pub(super) loops: bool,
    /// Current sources, which join no parts.
    pub(super) pushing: Vec<u32>,
    /// Nodes sorted by group, and where each group starts.
    members: (Vec<u32>, Vec<u32>),
}

impl Rails {
    pub(super) fn new(network: &Network) -> Self {
        let (ties, branch) = ties(network);
        let nodes = network.nodes.max(1) as usize;
        let pushing = network.branches.iter().enumerate().filter(|(_, b)| matches!(b.law, Law::Current(_)));
        let forest = Forest::new(nodes, &ties);
        let mut rails = Rails {
            forest,
            ties,
            branch,
            tainted: vec![false; nodes],
            contradictions: Vec::new(),
            loops: false,
            pushing: pushing.map(|(n, _)| n as u32).collect(),
            members: (Vec::new(), Vec::new()),
        };
        rails.members = members(&rails.forest);
        for chord in rails.forest.chords.clone() {
            rails.close(network, chord);
        }
        rails.spread_taint();
        rails
    }

    /// The nodes of a group.
    pub(super) fn nodes_of(&self, group: u32) -> &[u32] {
        let (nodes, start) = &self.members;
        &nodes[start[group as usize] as usize..start[group as usize + 1] as usize]
    }

    /// The nodes on the far side of a tie of the forest, seen from the root; `None` for any other branch.
    pub(super) fn beyond(&self, branch: u32) -> Option<Vec<bool>> {
        let tie = self.branch.iter().position(|&b| b == branch)?;
        let top = self.forest.up.iter().position(|&up| up == tie as u32)?;
        let mut beyond = vec![false; self.forest.up.len()];
        beyond[top] = true;
        for &node in &self.forest.order {
            let node = node as usize;
            if self.forest.up[node] != NONE && beyond[self.forest.parent[node] as usize] {
                beyond[node] = true;
            }
        }
        Some(beyond)
    }

    /// Checks the loop that a chord closes.
    fn close(&mut self, network: &Network, chord: u32) {
        let tie = self.ties[chord as usize];
        let walk = self.forest.walk(&self.ties, tie.b, tie.a);
        let mut around = vec![(chord, 1.0)];
        around.extend(walk);
        let level = |tie: u32| fixed(network.branches[self.branch[tie as usize] as usize].law);
        let terms: Vec<(f64, Level)> =
            around.iter().filter_map(|&(tie, sign)| level(tie).map(|l| (sign, l))).collect();
        if sign_of_sum(&terms) == Ordering::Equal {
            self.loops = true;
            return;
        }
        let gap: f64 = terms.iter().map(|(sign, l)| sign * l.value).sum();
        let mut nodes: Vec<u32> = around
            .iter()
            .flat_map(|&(tie, _)| [self.ties[tie as usize].a, self.ties[tie as usize].b])
            .collect();
        nodes.sort_unstable();
        nodes.dedup();
        // where the loop hangs on the rest, its potential is not in dispute
        if let Some(top) = nodes.iter().copied().min_by_key(|&n| self.depth(n)) {
            nodes.retain(|&n| n != top);
        }
        // nor where a source stands on the reference, unless it is another such source that disagrees with it
        if !holds(network, self.branch[chord as usize]) {
            let held = |&n: &u32| match self.forest.up[n as usize] {
                NONE => true,
                tie => holds(network, self.branch[tie as usize]),
            };
            nodes.retain(|n| !held(n));
        }
        for &n in &nodes {
            self.tainted[n as usize] = true;
        }
        let branches: Vec<u32> = around.iter().map(|&(tie, _)| self.branch[tie as usize]).collect();
        let reason = Reason::Loop { branches: branches.clone(), gap: gap.abs() };
        self.contradictions.push(Part {
            verdict: Verdict::None,
            reasons: vec![reason],
            branches,
            nodes,
            truncated: false,
        });
    }

    fn depth(&self, mut node: u32) -> usize {
        let mut steps = 0;
        while self.forest.up[node as usize] != NONE {
            node = self.forest.parent[node as usize];
            steps += 1;
        }
        steps
    }

    /// What hangs on a tainted node is tainted.
    fn spread_taint(&mut self) {
        for &node in &self.forest.order {
            if self.forest.up[node as usize] != NONE
                && self.tainted[self.forest.parent[node as usize] as usize]
            {
                self.tainted[node as usize] = true;
            }
        }
    }
}

/// Branches of fixed voltage; sources that stand on the reference come first, since what they hold is a boundary.
fn ties(network: &Network) -> (Vec<Tie>, Vec<u32>) {
    let fixed = network
        .branches
        .iter()
        .enumerate()
        .filter_map(|(n, b)| fixed(b.law).map(|level| (n as u32, b, level)));
    let (first, rest): (Vec<_>, Vec<_>) = fixed.partition(|&(n, ..)| holds(network, n));
    first
        .into_iter()
        .chain(rest)
        .map(|(n, b, level)| (Tie { a: b.from, b: b.to, volts: level.value.into() }, n))
        .unzip()
}

/// A voltage source between the reference and another node.
fn holds(network: &Network, branch: u32) -> bool {
    let b = &network.branches[branch as usize];
    matches!(b.law, Law::Voltage(_)) && (b.from == 0) != (b.to == 0)
}

fn members(forest: &Forest) -> (Vec<u32>, Vec<u32>) {
    let mut start = vec![0u32; forest.groups + 1];
    for &g in &forest.group {
        start[g as usize + 1] += 1;
    }
    for g in 0..forest.groups {
        start[g + 1] += start[g];
    }
    let mut next = start.clone();
    let mut nodes = vec![0u32; forest.group.len()];
    for (n, &g) in forest.group.iter().enumerate() {
        nodes[next[g as usize] as usize] = n as u32;
        next[g as usize] += 1;
    }
    (nodes, start)
}

/// The level of a branch whose voltage stands whatever it carries.
pub(super) fn fixed(law: Law) -> Option<Level> {
    match law {
        Law::Voltage(level) => Some(level),
        Law::Short => Some(Level { value: 0.0, exact: true }),
        _ => None,
    }
}
