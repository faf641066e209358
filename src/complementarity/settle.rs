//! The exact solve for given states: junctions that pin a voltage tie groups of nodes into clusters, the rest is a
//! resistor network refined in double-double arithmetic. Every assumption is then checked, and those that fail
//! change; no resistance and no leak that the circuit does not have is left in the answer.

use super::double_double::Dd;
use super::forest::{Forest, NONE, Sets, Tie};
use super::laplacian::Laplacian;
use super::passive::{Diode, Passive, Point, State};

/// Rounds of solve and check.
const ROUNDS: usize = 12;
/// Share of the largest term below which a voltage or current is nothing.
const NOTHING: f64 = 1e-12;

/// A settled point and what was found on the way.
pub(super) struct Settled {
    pub(super) point: Point,
    /// Diodes of no series resistance whose inner voltage stands at a level within one cluster: their currents may
    /// be open.
    pub(super) tied: bool,
    pub(super) factorizations: usize,
    /// Every assumption holds.
    pub(super) holds: bool,
}

/// Solves for the states of `guide`, mends those that fail, and solves again.
pub(super) fn settle(part: &Passive, mut guide: Point) -> Settled {
    let mut factorizations = 0;
    let mut last = usize::MAX;
    let mut stuck = 0;
    loop {
        let mut solve = Solve::new(part, &guide);
        let currents = solve.run();
        factorizations += solve.system.factorizations;
        let checks = solve.check(&currents);
        let failing = checks.iter().zip(&guide.states).filter(|(new, old)| new != old).count();
        let tied = solve.tied(&checks);
        let leaks = solve.leaks();
        let potentials = std::mem::take(&mut solve.potentials);
        drop(solve);
        if failing == 0 && !leaks {
            let point = Point { potentials, currents, states: checks };
            return Settled { point, tied, factorizations, holds: true };
        }
        stuck = if failing < last { 0 } else { stuck + 1 };
        last = failing.min(last);
        guide = Point { potentials, currents, states: checks };
        if failing == 0 || stuck > 3 || factorizations > ROUNDS {
            return Settled { point: guide, tied, factorizations, holds: false };
        }
    }
}

struct Solve<'a> {
    part: &'a Passive,
    guide: &'a Point,
    /// Diodes that pin a voltage without series resistance between two groups, and their numbers.
    ties: Vec<Tie>,
    tie_diode: Vec<u32>,
    forest: Forest,
    /// Branches that carry current by resistance: `(p, q, opposing voltage, ohms)`.
    links: Vec<(u32, u32, Dd, f64)>,
    link_diode: Vec<u32>,
    system: Laplacian,
    conductances: Vec<f64>,
    /// Cluster that stands at its guide potential, one for each floating island of clusters.
    pins: Vec<u32>,
    potentials: Vec<Dd>,
    /// Sum of the magnitudes of the terms that meet at each group.
    gross: Vec<f64>,
}

impl<'a> Solve<'a> {
    fn new(part: &'a Passive, guide: &'a Point) -> Self {
        let (mut ties, mut tie_diode) = (Vec::new(), Vec::new());
        let mut links: Vec<_> = part.resistors.iter().map(|r| (r.p, r.q, r.delta, r.ohms)).collect();
        let mut link_diode = vec![NONE; links.len()];
        for (n, (d, &state)) in part.diodes.iter().zip(&guide.states).enumerate() {
            let Some(level) = d.level(state) else { continue };
            if d.series > 0.0 {
                links.push((d.p, d.q, d.delta - level.into(), d.series));
                link_diode.push(n as u32);
            } else if d.p != d.q {
                ties.push(Tie { a: d.p, b: d.q, volts: Dd::from(level) - d.delta });
                tie_diode.push(n as u32);
            }
        }
        let forest = Forest::new(part.nodes, &ties);
        let cluster = |n: u32| forest.group[n as usize];
        let mut edges: Vec<(u32, u32)> = links.iter().map(|l| (cluster(l.0), cluster(l.1))).collect();
        let mut conductances: Vec<f64> = links.iter().map(|l| 1.0 / l.3).collect();
        let mut sets = Sets::new(forest.groups);
        for &(a, b) in &edges {
            sets.union(a, b);
        }
        let pins: Vec<u32> = (1..forest.groups as u32).filter(|&c| sets.find(c) == c).collect();
        edges.extend(pins.iter().map(|&c| (c, 0)));
        conductances.resize(edges.len(), part.scales().least);
        let system = Laplacian::new(forest.groups, edges);
        let (potentials, gross) = (vec![Dd::ZERO; part.nodes], vec![0.0; part.nodes]);
        Solve {
            part,
            guide,
            ties,
            tie_diode,
            forest,
            links,
            link_diode,
            system,
            conductances,
            pins,
            potentials,
            gross,
        }
    }

    /// Solves; returns the currents of all diodes.
    fn run(&mut self) -> Vec<f64> {
        let extra = self.extra_currents();
        let mut cluster_volts = vec![Dd::ZERO; self.forest.groups];
        self.system.factor(&self.conductances, true);
        let mut worst = self.refine(&mut cluster_volts, &extra);
        if !(worst <= 1e-15) && self.system.factor_again(&self.conductances) {
            cluster_volts = vec![Dd::ZERO; self.forest.groups];
            worst = self.refine(&mut cluster_volts, &extra);
        }
        let _ = worst;
        self.lift_islands(&mut cluster_volts);
        let nothing = 1e-26 * self.part.scales().volts;
        for n in 0..self.part.nodes {
            let u = cluster_volts[self.forest.group[n] as usize] + self.forest.offset[n];
            // what is left of a cancellation at the last digits is nothing
            self.potentials[n] = if u.abs() <= nothing { Dd::ZERO } else { u };
        }
        self.tree_currents(extra)
    }

    /// Currents of ties that close a loop: taken from the guide, since the laws leave them open.
    fn extra_currents(&self) -> Vec<f64> {
        let mut extra = vec![0.0; self.part.diodes.len()];
        for &chord in &self.forest.chords {
            let n = self.tie_diode[chord as usize] as usize;
            extra[n] = match self.guide.states[n] {
                State::Forward => self.guide.currents[n].max(0.0),
                State::Reverse => self.guide.currents[n].min(0.0),
                State::Blocking => 0.0,
            };
        }
        extra
    }

    /// Net current into each group at these cluster potentials, chords included; fills `gross`.
    fn residual(&mut self, cluster_volts: &[Dd], extra: &[f64]) -> Vec<Dd> {
        let mut net = self.part.injected.clone();
        for (gross, i) in self.gross.iter_mut().zip(&net) {
            *gross = i.abs();
        }
        let forest = &self.forest;
        let at = |n: u32| cluster_volts[forest.group[n as usize] as usize] + forest.offset[n as usize];
        for &(p, q, delta, ohms) in &self.links {
            let (up, uq) = (at(p), at(q));
            let i = (up - uq + delta).over(ohms);
            net[p as usize] += -i;
            net[q as usize] += i;
            let terms = (up.abs() + uq.abs() + delta.abs()) / ohms;
            self.gross[p as usize] += terms;
            self.gross[q as usize] += terms;
        }
        for &chord in &self.forest.chords {
            let tie = &self.ties[chord as usize];
            let i = extra[self.tie_diode[chord as usize] as usize];
            for (node, value) in [(tie.a, -i), (tie.b, i)] {
                net[node as usize] += value.into();
                self.gross[node as usize] += i.abs();
            }
        }
        net
    }

    /// Iterative refinement with residuals in twice the precision; returns the residual's last share of the gross
    /// currents.
    fn refine(&mut self, cluster_volts: &mut [Dd], extra: &[f64]) -> f64 {
        let (mut before, mut idle) = (f64::INFINITY, 0);
        // small parts may hold any spread of resistances; in large ones every round counts
        let enough = if self.part.nodes > 2000 { 1e-21 } else { 1e-27 };
        for _ in 0..12 {
            let net = self.residual(cluster_volts, extra);
            let mut rhs = vec![Dd::ZERO; self.forest.groups];
            let mut gross = vec![0.0; self.forest.groups];
            for n in 0..self.part.nodes {
                rhs[self.forest.group[n] as usize] += net[n];
                gross[self.forest.group[n] as usize] += self.gross[n];
            }
            let mut rhs: Vec<f64> = rhs.into_iter().map(Dd::round).collect();
            let shares =
                rhs.iter().zip(&gross).skip(1).map(|(r, g)| if *g > 0.0 { r.abs() / g } else { 0.0 });
            let worst = shares.fold(0.0, f64::max);
            idle = if worst > 0.5 * before { idle + 1 } else { 0 };
            if worst <= enough || idle > 2 || !worst.is_finite() {
                return worst;
            }
            before = before.min(worst);
            self.system.solve(&mut rhs);
            for (u, correction) in cluster_volts.iter_mut().zip(&rhs) {
                *u += (*correction).into();
            }
        }
        before
    }

    /// Islands of clusters that nothing ties to the reference keep the potential that the guide proposes.
    fn lift_islands(&self, cluster_volts: &mut [Dd]) {
        if self.pins.is_empty() {
            return;
        }
        let mut sets = Sets::new(self.forest.groups);
        for &(a, b) in &self.system.edges()[..self.links.len()] {
            sets.union(a, b);
        }
        let mut lift = vec![Dd::ZERO; self.forest.groups];
        for (n, &group) in self.forest.group.iter().enumerate().rev() {
            lift[group as usize] = self.guide.potentials[n] - self.forest.offset[n];
        }
        let pinned: Vec<Dd> = cluster_volts.to_vec();
        for (c, u) in cluster_volts.iter_mut().enumerate() {
            let root = sets.find(c as u32) as usize;
            if root != 0 {
                *u = *u + lift[root] - pinned[root];
            }
        }
    }

    /// Currents of diodes: of links by their law, of ties by Kirchhoff's law from the leaves of the forest.
    fn tree_currents(&mut self, mut currents: Vec<f64>) -> Vec<f64> {
        let cluster_volts: Vec<Dd> = self.cluster_volts();
        let mut net = self.residual(&cluster_volts, &currents);
        for (&n, &(p, q, delta, ohms)) in self.link_diode.iter().zip(&self.links) {
            if n != NONE {
                let v = self.potentials[p as usize] - self.potentials[q as usize] + delta;
                currents[n as usize] = v.over(ohms).round();
            }
        }
        for &node in self.forest.order.iter().rev() {
            let tie = self.forest.up[node as usize];
            if tie == NONE {
                continue;
            }
            let leaving = net[node as usize];
            let parent = self.forest.parent[node as usize] as usize;
            net[parent] += leaving;
            let below = self.gross[node as usize];
            self.gross[parent] += below;
            let sign = if self.ties[tie as usize].a == node { 1.0 } else { -1.0 };
            currents[self.tie_diode[tie as usize] as usize] = sign * leaving.round();
        }
        currents
    }

    fn cluster_volts(&self) -> Vec<Dd> {
        let mut volts = vec![Dd::ZERO; self.forest.groups];
        for (n, &group) in self.forest.group.iter().enumerate() {
            volts[group as usize] = self.potentials[n] - self.forest.offset[n];
        }
        volts
    }

    /// The state that each diode should have at this point.
    fn check(&self, currents: &[f64]) -> Vec<State> {
        let mut small = vec![f64::NAN; self.part.diodes.len()];
        self.nothing_of_ties(&mut small);
        let diodes = self.part.diodes.iter().zip(&self.guide.states).zip(currents).zip(&small);
        diodes
            .map(|(((d, &state), &i), &small)| {
                let v = self.part.across(d, &self.potentials);
                let room = NOTHING * d.scale(&self.potentials);
                let small = if small.is_nan() && d.series > 0.0 { room / d.series } else { small };
                judge(d, state, (v - (d.series * i).into()).round(), i, room, small)
            })
            .collect()
    }

    /// Current that counts as nothing in each tie of the forest: a share of what meets on its smaller side.
    fn nothing_of_ties(&self, small: &mut [f64]) {
        let mut whole = vec![f64::INFINITY; self.forest.groups];
        for (node, &tie) in self.forest.up.iter().enumerate() {
            if tie == NONE && node != 0 {
                whole[self.forest.group[node] as usize] = self.gross[node];
            }
        }
        for (node, &tie) in self.forest.up.iter().enumerate() {
            if tie != NONE {
                let below = self.gross[node];
                let rest = (whole[self.forest.group[node] as usize] - below).max(0.0);
                // even where one side has no terms at all, rounding on the other side is nothing
                let noise = NOTHING * below.max(if rest.is_finite() { rest } else { 0.0 });
                small[self.tie_diode[tie as usize] as usize] = NOTHING * below.min(rest).max(noise);
            }
        }
        for &chord in &self.forest.chords {
            small[self.tie_diode[chord as usize] as usize] = 0.0;
        }
    }

    /// Whether an island gets current that no state lets out.
    fn leaks(&self) -> bool {
        if self.pins.is_empty() {
            return false;
        }
        let mut sets = Sets::new(self.forest.groups);
        for &(a, b) in &self.system.edges()[..self.links.len()] {
            sets.union(a, b);
        }
        let mut sums = vec![(Dd::ZERO, 0.0); self.forest.groups];
        for (&group, &i) in self.forest.group.iter().zip(&self.part.injected) {
            let sum = &mut sums[sets.find(group) as usize];
            sum.0 += i;
            sum.1 += i.abs();
        }
        self.pins.iter().any(|&c| sums[c as usize].0.abs() > NOTHING * sums[c as usize].1)
    }

    /// Whether some level is met between two groups of one cluster other than by the forest itself.
    fn tied(&self, states: &[State]) -> bool {
        let mut in_forest = vec![false; states.len()];
        for &tie in self.forest.up.iter().filter(|t| **t != NONE) {
            in_forest[self.tie_diode[tie as usize] as usize] = true;
        }
        self.part.diodes.iter().enumerate().any(|(n, d)| {
            !in_forest[n] && d.series == 0.0 && at_level(d, self.part, &self.potentials).is_some()
        })
    }
}

/// The level at which a diode's terminals stand, within tolerance, were it to carry nothing.
pub(super) fn at_level(d: &Diode, part: &Passive, potentials: &[Dd]) -> Option<State> {
    let v = part.across(d, potentials);
    let room = NOTHING * d.scale(potentials);
    if (v - d.forward.into()).abs() <= room {
        Some(State::Forward)
    } else if d.reverse.is_finite() && (v + d.reverse.into()).abs() <= room {
        Some(State::Reverse)
    } else {
        None
    }
}

/// What a diode with inner voltage `v` and current `i` should be, seen from `state`.
fn judge(d: &Diode, state: State, v: f64, i: f64, room: f64, small: f64) -> State {
    match state {
        // a chord whose voltage misses its level contradicts the loop it closes
        State::Forward if (v - d.forward).abs() > room => {
            if v > d.forward {
                State::Forward
            } else {
                State::Blocking
            }
        }
        State::Reverse if (v + d.reverse).abs() > room => {
            if v < -d.reverse {
                State::Reverse
            } else {
                State::Blocking
            }
        }
        State::Forward if i <= small => State::Blocking,
        State::Reverse if i >= -small => State::Blocking,
        State::Blocking if v > d.forward + room => State::Forward,
        State::Blocking if v < -d.reverse - room => State::Reverse,
        same => same,
    }
}
