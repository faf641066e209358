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
    let group = |n: u32| rails.forest.group[n as usize];
    let mut sets = Sets::new(rails.forest.groups);
    let join = |sets: &mut Sets, nodes: &[u32]| {
        let mut first = None;
        for g in nodes.iter().map(|&n| group(n)).filter(|&g| g != 0) {
            match first {
                None => first = Some(g),
                Some(f) => {
                    sets.union(f, g);
                }
            }
        }
    };
    for b in &network.branches {
        match b.law {
            Law::Current(_) | Law::Voltage(_) | Law::Short => {}
            Law::VoltageControlled(_, control) | Law::CurrentControlled(_, control) => {
                let mut nodes = vec![b.from, b.to];
                match control {
                    Control::Voltage(p, q) => nodes.extend([p, q]),
                    Control::Current(branch) => nodes.extend(far_side(network, rails, branch)),
                }
                join(&mut sets, &nodes);
            }
            _ => join(&mut sets, &[b.from, b.to]),
        }
    }
    collect(network, rails, &mut sets)
}

/// Nodes beside the branches that leave a tie's far side: what its current depends on.
fn far_side(network: &Network, rails: &Rails, branch: u32) -> Vec<u32> {
    let Some(b) = network.branches.get(branch as usize) else { return Vec::new() };
    let mut nodes = vec![b.from, b.to];
    if let Some(beyond) = rails.beyond(branch) {
        let leaves = |b: &&super::network::Branch| beyond[b.from as usize] != beyond[b.to as usize];
        let others = network.branches.iter().filter(|b| fixed(b.law).is_none()).filter(leaves);
        nodes.extend(others.flat_map(|b| [b.from, b.to]));
    }
    nodes
}

fn collect(network: &Network, rails: &Rails, sets: &mut Sets) -> Vec<Piece> {
    let group = |n: u32| rails.forest.group[n as usize];
    let mut number = vec![u32::MAX; rails.forest.groups];
    let mut pieces: Vec<Piece> = Vec::new();
    let empty = |kind| Piece { kind, groups: Vec::new(), branches: Vec::new(), tainted: false };
    for g in 1..rails.forest.groups as u32 {
        let root = sets.find(g) as usize;
        if number[root] == u32::MAX {
            number[root] = pieces.len() as u32;
            pieces.push(empty(Kind::Passive));
        }
        number[g as usize] = number[root];
        pieces[number[root] as usize].groups.push(g);
    }
    for (n, b) in network.branches.iter().enumerate() {
        let own = [group(b.from), group(b.to)].into_iter().find(|&g| g != 0);
        let place = match (own, b.law) {
            (Some(g), _) => number[g as usize],
            // between boundaries: nothing else has a say in it
            (None, law) if fixed(law).is_none() => {
                pieces.push(empty(Kind::Passive));
                pieces.len() as u32 - 1
            }
            _ => continue,
        };
        let piece = &mut pieces[place as usize];
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
