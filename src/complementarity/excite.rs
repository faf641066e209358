//! How far small uncertainties of junctions spread, all keeping their places: the network with every source at
//! nothing and one unit put in where the answer is wanted. By reciprocity its currents and voltages are the
//! sensitivities of that answer to each level and each leak.

use super::equations::Equations;
use super::exact::Solve;
use super::forest::NONE;
use super::general::together;
use super::linear::solved;
use super::network::Network;
use super::outcome::{Place, Solution};
use super::parts::Piece;
use super::passive::State;
use super::ports::Ports;
use super::rails::Rails;
use nalgebra::{DMatrix, RowDVector};
use rustc_hash::FxHashSet;

/// The worst that all uncertainties together do to one quantity, to first order.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Spread {
    /// Sum of the magnitudes.
    pub total: f64,
    /// What the quantity's own junction contributes.
    pub own: f64,
    /// Junction (branch number) that contributes most, and how much.
    pub most: (u32, f64),
}

impl Spread {
    /// What all others contribute.
    pub fn others(&self) -> f64 {
        (self.total - self.own).max(0.0)
    }

    /// Both together.
    pub(super) fn and(self, other: Spread) -> Spread {
        let most = if self.most.1 >= other.most.1 { self.most } else { other.most };
        Spread { total: self.total + other.total, own: self.own + other.own, most }
    }

    const NOTHING: Spread = Spread { total: 0.0, own: 0.0, most: (NONE, 0.0) };

    fn add(&mut self, number: u32, amount: f64, is_own: bool) {
        // a leak of nothing behind an infinite response is nothing
        let amount = if amount.is_nan() { 0.0 } else { amount };
        self.total += amount;
        if is_own {
            self.own = amount;
        }
        if amount > self.most.1 {
            self.most = (number, amount);
        }
    }

    /// With the branch number of the junction instead of its number in the part.
    pub(super) fn numbered(mut self, branches: &[u32]) -> Spread {
        self.most.0 = branches.get(self.most.0 as usize).copied().unwrap_or(NONE);
        self
    }
}

/// Units put into a passive part.
pub(super) struct Excite<'a, 'b> {
    solve: &'a mut Solve<'b>,
    /// How uncertain each diode is.
    pub(super) doubts: Vec<f64>,
    /// Tie of each diode in the forest.
    tie: Vec<u32>,
    /// Change of each node's potential above its cluster.
    lift: Vec<f64>,
    net: Vec<f64>,
    at: Vec<f64>,
}

impl<'a, 'b> Excite<'a, 'b> {
    pub(super) fn new(solve: &'a mut Solve<'b>, doubts: Vec<f64>) -> Self {
        let nodes = solve.part.nodes;
        let mut tie = vec![NONE; solve.part.diodes.len()];
        for &t in solve.forest.up.iter().filter(|t| **t != NONE) {
            tie[solve.tie_diode[t as usize] as usize] = t;
        }
        let at = vec![0.0; solve.forest.groups];
        Excite { solve, doubts, tie, lift: vec![0.0; nodes], net: vec![0.0; nodes], at }
    }

    pub(super) fn blocks(&self, k: usize) -> bool {
        self.solve.guide.states[k] == State::Blocking
    }

    /// Of the current of a junction that carries some, or of the voltage of one that blocks.
    pub(super) fn junction(&mut self, k: usize) -> Option<Spread> {
        let d = self.solve.part.diodes[k];
        if self.solve.guide.states[k] == State::Blocking {
            return self.between_own(d.p, d.q, Some(k));
        }
        self.clear();
        if d.series > 0.0 {
            self.net[d.p as usize] += 1.0 / d.series;
            self.net[d.q as usize] -= 1.0 / d.series;
        } else {
            self.raise(self.tie[k])?;
        }
        let direct = if d.series > 0.0 { 1.0 / d.series } else { 0.0 };
        Some(self.sum(Some(k), direct))
    }

    /// Of the voltage between two nodes; `None` where nothing ties one to the other.
    pub(super) fn between(&mut self, p: u32, q: u32) -> Option<Spread> {
        self.between_own(p, q, None)
    }

    fn between_own(&mut self, p: u32, q: u32, own: Option<usize>) -> Option<Spread> {
        if !self.solve.joined(p, q) {
            return None;
        }
        self.clear();
        self.net[p as usize] -= 1.0;
        self.net[q as usize] += 1.0;
        Some(self.sum(own, 0.0))
    }

    fn clear(&mut self) {
        self.lift.fill(0.0);
        self.net.fill(0.0);
    }

    /// Raises the level of one tie by a volt.
    fn raise(&mut self, tie: u32) -> Option<()> {
        if tie == NONE {
            return None;
        }
        let forest = &self.solve.forest;
        let a = self.solve.ties[tie as usize].a;
        for &node in &forest.order {
            let up = forest.up[node as usize];
            if up != NONE {
                let own = if up != tie {
                    0.0
                } else if a == node {
                    1.0
                } else {
                    -1.0
                };
                self.lift[node as usize] = self.lift[forest.parent[node as usize] as usize] + own;
            }
        }
        for &(p, q, _, ohms) in &self.solve.links {
            let i = (self.lift[p as usize] - self.lift[q as usize]) / ohms;
            if i != 0.0 {
                self.net[p as usize] -= i;
                self.net[q as usize] += i;
            }
        }
        Some(())
    }

    /// Solves for what was put in, and sums the uncertainties. `direct` is what a unit level drives through its own
    /// series resistance at once.
    fn sum(&mut self, own: Option<usize>, direct: f64) -> Spread {
        self.at.fill(0.0);
        for (&group, &i) in self.solve.forest.group.iter().zip(&self.net) {
            self.at[group as usize] += i;
        }
        self.solve.system.solve(&mut self.at);
        let mut spread = Spread::NOTHING;
        self.links(own, direct, &mut spread);
        self.ties(own, &mut spread);
        let forest = &self.solve.forest;
        let potential = |n: u32| self.at[forest.group[n as usize] as usize] + self.lift[n as usize];
        for (k, d) in self.solve.part.diodes.iter().enumerate() {
            if self.solve.guide.states[k] == State::Blocking && self.doubts[k] > 0.0 {
                let v = (potential(d.p) - potential(d.q)).abs();
                spread.add(k as u32, v * self.doubts[k], own == Some(k));
            }
        }
        spread
    }

    /// Junctions that carry by their series resistance; takes the links' currents out of `net`.
    fn links(&mut self, own: Option<usize>, direct: f64, spread: &mut Spread) {
        let group = &self.solve.forest.group;
        for (&(p, q, _, ohms), &k) in self.solve.links.iter().zip(&self.solve.link_diode) {
            let i = (self.at[group[p as usize] as usize] - self.at[group[q as usize] as usize]) / ohms;
            self.net[p as usize] -= i;
            self.net[q as usize] += i;
            if k != NONE {
                let lifted = (self.lift[p as usize] - self.lift[q as usize]) / ohms;
                let is_own = own == Some(k as usize);
                let change = i + lifted - if is_own { direct } else { 0.0 };
                spread.add(k, change.abs() * self.doubts[k as usize], is_own);
            }
        }
    }

    /// Junctions that tie, by Kirchhoff's law from the leaves of the forest.
    fn ties(&mut self, own: Option<usize>, spread: &mut Spread) {
        let forest = &self.solve.forest;
        for &node in forest.order.iter().rev() {
            let tie = forest.up[node as usize];
            if tie != NONE {
                let leaving = self.net[node as usize];
                self.net[forest.parent[node as usize] as usize] += leaving;
                let k = self.solve.tie_diode[tie as usize];
                spread.add(k, leaving.abs() * self.doubts[k as usize], own == Some(k as usize));
            }
        }
    }
}

/// The same in a part with controlled laws, from what its junctions see of the linear rest.
pub(super) struct GeneralSpreads<'a> {
    pub(super) network: &'a Network,
    pub(super) rails: &'a Rails,
    pub(super) piece: &'a Piece,
    pub(super) solution: &'a Solution,
    pub(super) doubt: &'a dyn Fn(u32, f64) -> f64,
}

/// Bundles of junctions at most: the elimination is dense.
const MOST_BUNDLES: usize = 400;

/// A part reduced to its bundles.
struct Reduced<'a> {
    equations: Equations<'a>,
    ports: Ports,
    places: Vec<Place>,
    /// What each bundle's law answers to a unit on its right-hand side.
    inverse: DMatrix<f64>,
}

impl GeneralSpreads<'_> {
    fn reduced(&self) -> Option<Reduced<'_>> {
        if !super::general::fits(self.rails, self.piece) {
            return None;
        }
        let equations = Equations::new(self.network, self.rails, self.piece);
        let count = equations.bundles.len();
        if !equations.complete() || count > MOST_BUNDLES {
            return None;
        }
        let ports = Ports::new(self.network, &equations)?;
        let places: Vec<Place> = equations.bundles.iter().map(|b| together(b, self.solution)).collect();
        let mut matrix = DMatrix::zeros(count, count);
        for (k, &place) in places.iter().enumerate() {
            if place == Place::Unknown {
                return None;
            }
            matrix.set_row(k, &ports.row(k, place).0);
        }
        let inverse = solved(&matrix, &DMatrix::identity(count, count))?;
        Some(Reduced { equations, ports, places, inverse })
    }

    fn blocks(&self, n: u32) -> bool {
        self.solution.places[n as usize] == Place::Blocking
    }

    /// Of each junction: current where it carries some, voltage where it blocks.
    pub(super) fn junctions(&self) -> Vec<(u32, Spread)> {
        let Some(reduced) = self.reduced() else { return Vec::new() };
        let mut doubts = self.doubts(&reduced);
        let mut spreads = Vec::new();
        // what blocks first, as in passive parts
        for blocks in [true, false] {
            let mut moved = doubts.clone();
            for (k, bundle) in reduced.equations.bundles.iter().enumerate() {
                for (m, &n) in bundle.members.iter().enumerate().filter(|(_, n)| self.blocks(**n) == blocks) {
                    let ports = &reduced.ports;
                    let row = if blocks { ports.v_of_a.row(k) } else { ports.i_of_a.row(k) };
                    let spread = self.sum(&reduced, &(row * &reduced.inverse), &doubts, Some((k, n)));
                    if blocks {
                        moved[k][m] = (self.doubt)(n, spread.others());
                    }
                    spreads.push((n, spread));
                }
            }
            doubts = moved;
        }
        spreads
    }

    /// Of the voltage between two nodes, by the number of the pair.
    pub(super) fn pairs(&self, pairs: &[(u32, u32)]) -> Vec<(usize, Spread)> {
        if pairs.is_empty() {
            return Vec::new();
        }
        let Some(reduced) = self.reduced() else { return Vec::new() };
        let doubts = self.doubts(&reduced);
        let equations = &reduced.equations;
        let own: FxHashSet<u32> = equations.nodes.iter().copied().collect();
        let is_known = |n: &u32| self.rails.forest.group[*n as usize] == 0 || own.contains(n);
        let change = |p: u32, q: u32| {
            let slopes = reduced.inverse.column_iter().map(|column| {
                equations.voltage_change(&reduced.ports.expand_change(&column.into_owned()), p, q)
            });
            RowDVector::from_vec(slopes.collect())
        };
        let all = pairs.iter().enumerate();
        let here = all.filter(|(_, (p, q))| own.contains(p) || own.contains(q));
        // a node of another part contributes there
        let local = |n: u32| if is_known(&n) { n } else { 0 };
        here.map(|(n, &(p, q))| (n, self.sum(&reduced, &change(local(p), local(q)), &doubts, None))).collect()
    }

    /// How uncertain each member of each bundle is.
    fn doubts(&self, reduced: &Reduced<'_>) -> Vec<Vec<f64>> {
        let bundles = reduced.equations.bundles.iter();
        bundles.map(|b| b.members.iter().map(|&n| (self.doubt)(n, 0.0)).collect()).collect()
    }

    /// Sums what `row`, the answer to a unit on each bundle's right-hand side, makes of the uncertainties.
    fn sum(
        &self,
        reduced: &Reduced<'_>,
        row: &RowDVector<f64>,
        doubts: &[Vec<f64>],
        own: Option<(usize, u32)>,
    ) -> Spread {
        let mut spread = Spread::NOTHING;
        for (k, bundle) in reduced.equations.bundles.iter().enumerate() {
            let blocks = reduced.places[k] == Place::Blocking;
            for (&n, &doubt) in bundle.members.iter().zip(&doubts[k]) {
                let beside = own.is_some_and(|(at, member)| at == k && !self.blocks(member));
                let answer = match (blocks, self.blocks(n)) {
                    (true, _) => row[k].abs() * reduced.ports.rho,
                    (false, false) => row[k].abs(),
                    // it takes its leakage from those that carry beside it
                    (false, true) if beside => 1.0,
                    (false, true) => 0.0,
                };
                spread.add(n, answer * doubt, own.is_some_and(|(_, member)| member == n));
            }
        }
        spread
    }
}
