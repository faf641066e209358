//! Currents of sources and shorts by Kirchhoff's current law, once all others are known.

use super::double_double::Dd;
use super::forest::NONE;
use super::network::Network;
use super::rails::{Rails, fixed};

/// What flows into a set of nodes other than through ties.
#[derive(Clone, Copy, Default)]
struct Inflow {
    net: Dd,
    /// Sum of magnitudes.
    gross: f64,
    /// Terms that are not known.
    unknown: usize,
}

impl Inflow {
    fn add(&mut self, other: Inflow) {
        self.net += other.net;
        self.gross += other.gross;
        self.unknown += other.unknown;
    }
}

/// Fills in the currents of ties; a tie that closes a loop carries nothing here. NaN where not known.
pub(super) fn tie_currents(network: &Network, rails: &Rails, currents: &mut [f64]) {
    let forest = &rails.forest;
    let own = own(network, currents);
    for (n, b) in network.branches.iter().enumerate() {
        if fixed(b.law).is_some() {
            let sound = !rails.tainted[b.from as usize] && !rails.tainted[b.to as usize];
            currents[n] = if sound { 0.0 } else { f64::NAN };
        }
    }
    let mut below = own;
    for &node in forest.order.iter().rev() {
        if forest.up[node as usize] != NONE {
            let value = below[node as usize];
            below[forest.parent[node as usize] as usize].add(value);
        }
    }
    let mut root = vec![NONE; forest.groups];
    for &node in forest.order.iter().filter(|&&n| forest.up[n as usize] == NONE) {
        root[forest.group[node as usize] as usize] = node;
    }
    for &node in &forest.order {
        let tie = forest.up[node as usize];
        if tie == NONE || rails.tainted[node as usize] {
            continue;
        }
        let sign = if rails.ties[tie as usize].a == node { 1.0 } else { -1.0 };
        let root = root[forest.group[node as usize] as usize];
        let value = through(below[node as usize], below[root as usize], root == 0);
        currents[rails.branch[tie as usize] as usize] = sign * value;
    }
    for &branch in rails.contradictions.iter().flat_map(|part| &part.branches) {
        currents[branch as usize] = f64::NAN;
    }
}

fn own(network: &Network, currents: &[f64]) -> Vec<Inflow> {
    let mut own = vec![Inflow::default(); network.nodes.max(1) as usize];
    for (b, &i) in network.branches.iter().zip(currents) {
        if fixed(b.law).is_some() || b.from == b.to {
            continue;
        }
        for (node, value) in [(b.from as usize, -i), (b.to as usize, i)] {
            let unknown = i.is_nan();
            let value = if unknown { 0.0 } else { value };
            own[node].add(Inflow { net: value.into(), gross: value.abs(), unknown: usize::from(unknown) });
        }
    }
    own
}

/// Current that leaves the nodes below through their tie: what flows in below, or what flows out above, whichever
/// has the smaller terms, since each of them was rounded. The reference takes any current, so above it nothing is
/// told.
fn through(below: Inflow, whole: Inflow, reference: bool) -> f64 {
    let above = Inflow {
        net: below.net - whole.net,
        gross: (whole.gross - below.gross).max(0.0),
        unknown: whole.unknown - below.unknown + usize::from(reference),
    };
    let better = match (below.unknown > 0, above.unknown > 0) {
        (true, true) => return f64::NAN,
        (false, true) => below,
        (true, false) => above,
        (false, false) if above.gross < below.gross => above,
        _ => below,
    };
    let value = better.net.round();
    if value.abs() <= 4.0 * f64::EPSILON * better.gross { 0.0 } else { value }
}
