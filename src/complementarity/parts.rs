//! Splits a network into parts that do not influence each other: groups of tied nodes, joined by every branch
//! that answers to a voltage. Current sources join nothing, since their current is known.

use super::double_double::Dd;
use super::forest::Sets;
use super::network::{Control, Law, Network};
use super::passive::{Diode, Passive, Resistor};
use super::rails::{Rails, fixed};

/// What a part holds, the worst first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Kind {
    /// Resistances, sources, junctions.
    Passive,
    /// Also controlled laws or negative resistances.
    General,
    /// A law that is not known.
    Unknown,
}

/// One part: groups (never group 0) and branches by number.
#[derive(Debug, Clone)]
pub(super) struct Piece {
    pub(super) kind: Kind,
    pub(super) groups: Vec<u32>,
    pub(super) branches: Vec<u32>,
    /// Touches a node that contradicting sources hold.
    pub(super) tainted: bool,
}

/// The parts, in the order of their first group or branch.
pub(super) fn split(network: &Network, rails: &Rails) -> Vec<Piece> {
    let items = Items { network, rails };
    let mut sets = Sets::new(rails.forest.groups + network.branches.len());
    let mut joined = Vec::new();
    for (n, b) in network.branches.iter().enumerate() {
        joined.clear();
        joined.extend(items.of_branch(n as u32));
        match b.law {
            Law::Current(_) | Law::Voltage(_) | Law::Short => continue,
            Law::VoltageControlled(_, control) | Law::CurrentControlled(_, control) => match control {
                Control::Voltage(p, q) => joined.extend([p, q].into_iter().filter_map(|n| items.of_node(n))),
                Control::Current(branch) => items.behind(branch, &mut joined),
            },
            _ => {}
        }
        joined.extend([b.from, b.to].into_iter().filter_map(|n| items.of_node(n)));
        for pair in joined.windows(2) {
            sets.union(pair[0], pair[1]);
        }
    }
    collect(&items, &mut sets)
}

/// What can be joined to a part: groups of nodes by number, then branches between boundaries.
struct Items<'a> {
    network: &'a Network,
    rails: &'a Rails,
}

impl Items<'_> {
    fn of_node(&self, node: u32) -> Option<u32> {
        Some(self.rails.forest.group[node as usize]).filter(|&g| g != 0)
    }

    /// Where a branch belongs; ties between boundaries belong nowhere.
    fn of_branch(&self, n: u32) -> Option<u32> {
        let b = self.network.branches.get(n as usize)?;
        let own = (fixed(b.law).is_none()).then_some(self.rails.forest.groups as u32 + n);
        self.of_node(b.from).or_else(|| self.of_node(b.to)).or(own)
    }

    /// Everything that the current of a tie depends on: the branches that leave its far side.
    fn behind(&self, branch: u32, joined: &mut Vec<u32>) {
        joined.extend(self.of_branch(branch));
        if let Some(beyond) = self.rails.beyond(branch) {
            let leaves = |b: &super::network::Branch| beyond[b.from as usize] != beyond[b.to as usize];
            let others = self.network.branches.iter().enumerate();
            let others = others.filter(|(_, b)| fixed(b.law).is_none() && leaves(b));
            joined.extend(others.filter_map(|(n, _)| self.of_branch(n as u32)));
        }
    }
}

fn collect(items: &Items<'_>, sets: &mut Sets) -> Vec<Piece> {
    let (network, rails) = (items.network, items.rails);
    let mut number = vec![u32::MAX; rails.forest.groups + network.branches.len()];
    let mut pieces: Vec<Piece> = Vec::new();
    let mut place = |pieces: &mut Vec<Piece>, root: u32| {
        let number = &mut number[root as usize];
        if *number == u32::MAX {
            *number = pieces.len() as u32;
            pieces.push(Piece {
                kind: Kind::Passive,
                groups: Vec::new(),
                branches: Vec::new(),
                tainted: false,
            });
        }
        *number as usize
    };
    for g in 1..rails.forest.groups as u32 {
        let at = place(&mut pieces, sets.find(g));
        pieces[at].groups.push(g);
    }
    for (n, b) in network.branches.iter().enumerate() {
        let Some(item) = items.of_branch(n as u32) else { continue };
        // a tie that closes on itself says nothing about anything else
        if fixed(b.law).is_some() && b.from == b.to {
            continue;
        }
        let at = place(&mut pieces, sets.find(item));
        let piece = &mut pieces[at];
        piece.branches.push(n as u32);
        piece.kind = piece.kind.max(kind(b.law));
        if !matches!(b.law, Law::Current(_)) {
            piece.tainted |= rails.tainted[b.from as usize] || rails.tainted[b.to as usize];
        }
    }
    pieces
}

fn kind(law: Law) -> Kind {
    match law {
        Law::Unknown => Kind::Unknown,
        Law::VoltageControlled(..) | Law::CurrentControlled(..) => Kind::General,
        Law::Resistance(r) if r < 0.0 => Kind::General,
        _ => Kind::Passive,
    }
}

/// The monotone network of a passive part, and the branch number of each of its diodes and resistors.
pub(super) struct Built {
    pub(super) part: Passive,
    pub(super) diodes: Vec<u32>,
    pub(super) resistors: Vec<u32>,
}

/// Builder with room for the numbers of all groups, so that many small parts stay cheap.
pub(super) struct Builder<'a> {
    network: &'a Network,
    rails: &'a Rails,
    /// Current that sources push into each group of the whole network.
    injected: Vec<Dd>,
    local: Vec<u32>,
}

impl<'a> Builder<'a> {
    pub(super) fn new(network: &'a Network, rails: &'a Rails) -> Self {
        let mut injected = vec![Dd::ZERO; rails.forest.groups];
        for b in &network.branches {
            if let Law::Current(level) = b.law {
                injected[rails.forest.group[b.from as usize] as usize] += Dd::from(-level.value);
                injected[rails.forest.group[b.to as usize] as usize] += Dd::from(level.value);
            }
        }
        Builder { network, rails, injected, local: vec![0; rails.forest.groups] }
    }

    pub(super) fn build(&mut self, piece: &Piece) -> Built {
        let mut part =
            Passive { nodes: piece.groups.len() + 1, injected: vec![Dd::ZERO], ..Passive::default() };
        for (n, &g) in piece.groups.iter().enumerate() {
            self.local[g as usize] = n as u32 + 1;
            part.injected.push(self.injected[g as usize]);
        }
        let forest = &self.rails.forest;
        let (mut diodes, mut resistors) = (Vec::new(), Vec::new());
        for &number in &piece.branches {
            let b = &self.network.branches[number as usize];
            let (p, q) = (self.place(b.from), self.place(b.to));
            let delta = forest.offset[b.from as usize] - forest.offset[b.to as usize];
            match b.law {
                Law::Resistance(ohms) => {
                    part.resistors.push(Resistor { p, q, delta, ohms });
                    resistors.push(number);
                }
                Law::Junction(j) => {
                    let reverse = j.reverse.map_or(f64::INFINITY, |r| r.value);
                    let (forward, series) = (j.forward.value, j.series);
                    part.diodes.push(Diode { p, q, delta, forward, reverse, series });
                    diodes.push(number);
                }
                _ => {}
            }
        }
        Built { part, diodes, resistors }
    }

    /// Number of a node's group in the part that is being built; boundaries are 0.
    fn place(&self, node: u32) -> u32 {
        match self.rails.forest.group[node as usize] {
            0 => 0,
            g => self.local[g as usize],
        }
    }
}
