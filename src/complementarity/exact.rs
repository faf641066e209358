//! The linear circuit of given states, without resistance and leak that it does not have: junctions that pin a
//! voltage tie groups of nodes into clusters, the rest is a resistor network refined in double-double arithmetic.
//! Whether the states are right is for `settle` to say.

use super::double_double::Dd;
use super::forest::{Adjacency, Forest, NONE, Sets, Tie};
use super::laplacian::Laplacian;
use super::passive::{Diode, Passive, Point, State};

/// Share of the largest term below which a voltage or current is nothing.
pub(super) const NOTHING: f64 = 1e-12;
/// Share of the part's largest voltage that counts beside the voltages at a diode itself.
pub(super) const FLOOR: f64 = 0.01;

pub(super) struct Solve<'a> {
    pub(super) part: &'a Passive,
    pub(super) guide: &'a Point,
    /// Diodes that pin a voltage without series resistance between two groups, and their numbers.
    pub(super) ties: Vec<Tie>,
    pub(super) tie_diode: Vec<u32>,
    pub(super) forest: Forest,
    /// Branches that carry current by resistance: `(p, q, opposing voltage, ohms)`.
    pub(super) links: Vec<(u32, u32, Dd, f64)>,
    pub(super) link_diode: Vec<u32>,
    pub(super) system: Laplacian,
    conductances: Vec<f64>,
    /// Cluster that stands at its guide potential, one for each floating island of clusters.
    pins: Vec<u32>,
    pub(super) potentials: Vec<Dd>,
    /// Sum of the magnitudes of the terms that meet at each group.
    pub(super) gross: Vec<f64>,
    /// Largest voltage level of the part.
    volts: f64,
    lazy: Option<Neighbours>,
    islands: Option<Sets>,
}

impl<'a> Solve<'a> {
    pub(super) fn new(part: &'a Passive, guide: &'a Point) -> Self {
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
            volts: part.scales().volts,
            lazy: None,
            islands: None,
        }
    }

    /// Solves; returns the currents of all diodes.
    pub(super) fn run(&mut self) -> Vec<f64> {
        let extra = self.extra_currents();
        let mut cluster_volts = vec![Dd::ZERO; self.forest.groups];
        self.system.factor(&self.conductances, true);
        let share = self.refine(&mut cluster_volts, &extra);
        let converged = share <= 1e-10;
        if !converged && self.system.factor_again(&self.conductances) {
            cluster_volts = vec![Dd::ZERO; self.forest.groups];
            self.refine(&mut cluster_volts, &extra);
        }
        self.lift_islands(&mut cluster_volts);
        let nothing = 1e-24 * self.volts;
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
        let largest = self.guide.currents.iter().fold(0.0, |m: f64, i| m.max(i.abs()));
        for &chord in &self.forest.chords {
            let n = self.tie_diode[chord as usize] as usize;
            extra[n] = match self.guide.states[n] {
                State::Forward => self.guide.currents[n].max(0.0),
                State::Reverse => self.guide.currents[n].min(0.0),
                State::Blocking => 0.0,
            };
            // the guide is no better than this
            if extra[n].abs() <= 1e-6 * largest {
                extra[n] = 0.0;
            }
        }
        extra
    }

    /// Net current into each group at these cluster potentials, chords included; fills `gross`.
    fn residual(&mut self, cluster_volts: &[Dd], extra: &[f64]) -> Vec<Dd> {
        let mut net = self.part.injected.clone();
        for (gross, i) in self.gross.iter_mut().zip(&net) {
            *gross = i.abs();
        }
        // terms that rounding alone leaves are held against something that is not rounding
        let floor = 1e-6 * self.volts;
        let forest = &self.forest;
        let at = |n: u32| cluster_volts[forest.group[n as usize] as usize] + forest.offset[n as usize];
        for &(p, q, delta, ohms) in &self.links {
            let (up, uq) = (at(p), at(q));
            let i = (up - uq + delta).over(ohms);
            net[p as usize] += -i;
            net[q as usize] += i;
            let terms = (up.abs() + uq.abs() + delta.abs() + floor) / ohms;
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

    /// Iterative refinement with residuals in twice the precision; returns the last correction as a share of the
    /// largest voltage.
    fn refine(&mut self, cluster_volts: &mut [Dd], extra: &[f64]) -> f64 {
        let (mut before, mut idle) = (f64::INFINITY, 0);
        // small parts may hold any spread of resistances; in large ones every round counts
        let enough = if self.part.is_large() { 1e-10 } else { 1e-24 };
        for _ in 0..12 {
            let net = self.residual(cluster_volts, extra);
            let mut rhs = vec![Dd::ZERO; self.forest.groups];
            for (&group, &i) in self.forest.group.iter().zip(&net) {
                rhs[group as usize] += i;
            }
            let mut rhs: Vec<f64> = rhs.into_iter().map(Dd::round).collect();
            self.system.solve(&mut rhs);
            let (mut step, mut size) = (0.0f64, self.volts);
            for (u, correction) in cluster_volts.iter_mut().zip(&rhs) {
                *u += (*correction).into();
                step = step.max(correction.abs());
                size = size.max(u.abs());
            }
            let share = step / size;
            idle = if share > 0.5 * before { idle + 1 } else { 0 };
            before = before.min(share);
            // corrections shrink by the same factor each round, so the next would be far below
            if share <= enough || idle > 2 || !share.is_finite() {
                return share;
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
        let rounding = 1e-14 * self.volts;
        for (n, &group) in self.forest.group.iter().enumerate().rev() {
            let proposed = self.guide.potentials[n] - self.forest.offset[n];
            lift[group as usize] = if proposed.abs() <= rounding { Dd::ZERO } else { proposed };
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

    /// Islands of clusters that get current which no state lets out: the island of each group, and the current that
    /// each island gains. `None` where there is none.
    pub(super) fn leaking(&self) -> Option<(Vec<u32>, Vec<f64>)> {
        if self.pins.is_empty() {
            return None;
        }
        let mut sets = Sets::new(self.forest.groups);
        for &(a, b) in &self.system.edges()[..self.links.len()] {
            sets.union(a, b);
        }
        let island: Vec<u32> = self.forest.group.iter().map(|&g| sets.find(g)).collect();
        let mut sums = vec![(Dd::ZERO, 0.0); self.forest.groups];
        for (&root, &i) in island.iter().zip(&self.part.injected) {
            let sum = &mut sums[root as usize];
            sum.0 += i;
            sum.1 += i.abs();
        }
        let gain = |&(sum, gross): &(Dd, f64)| if sum.abs() > NOTHING * gross { sum.round() } else { 0.0 };
        let mut gains: Vec<f64> = sums.iter().map(gain).collect();
        gains[0] = 0.0;
        gains.iter().any(|&g| g != 0.0).then_some((island, gains))
    }

    /// Whether some level is met between two groups of one cluster other than by the forest itself.
    pub(super) fn tied(&self, diodes: usize) -> bool {
        let mut in_forest = vec![false; diodes];
        for &tie in self.forest.up.iter().filter(|t| **t != NONE) {
            in_forest[self.tie_diode[tie as usize] as usize] = true;
        }
        self.part.diodes.iter().enumerate().any(|(n, d)| {
            !in_forest[n] && d.series == 0.0 && at_level(d, self.part, &self.potentials, self.volts).is_some()
        })
    }

    /// Change of the current through the tie above `node` for each volt that its diode's level moves (adjoint of
    /// the resistance it sees): 0 where nothing but current sources sets it, or where a loop of ties leaves it open.
    pub(super) fn response(&mut self, node: u32) -> f64 {
        let near = self.lazy.take().unwrap_or_else(|| Neighbours::new(self));
        let side = self.subtree(node, &near);
        let inside = |n: u32| side.binary_search(&n).is_ok();
        let mut rhs = vec![0.0; self.forest.groups];
        let mut direct = 0.0;
        let mut crossing = Vec::new();
        let mut open = false;
        for &n in &side {
            open |= near.chords.of(n).iter().any(|&(_, other)| !inside(other));
            for &(link, other) in near.links.of(n).iter().filter(|(_, other)| !inside(*other)) {
                let g = 1.0 / self.links[link as usize].3;
                rhs[self.forest.group[n as usize] as usize] -= g;
                rhs[self.forest.group[other as usize] as usize] += g;
                direct += g;
                crossing.push((n, other, g));
            }
        }
        self.lazy = Some(near);
        if open || crossing.is_empty() {
            return 0.0;
        }
        self.system.solve(&mut rhs);
        let at = |n: u32| rhs[self.forest.group[n as usize] as usize];
        let answer: f64 = crossing.iter().map(|&(n, other, g)| g * (at(n) - at(other))).sum();
        let change = (direct + answer).abs();
        if change <= 1e-9 * direct { 0.0 } else { change }
    }

    /// Voltage against which differences at a diode are judged.
    pub(super) fn scale(&self, d: &Diode) -> f64 {
        d.scale(&self.potentials) + FLOOR * self.volts
    }

    /// The same for a diode that carries current by its series resistance.
    pub(super) fn link_response(&mut self, d: &Diode) -> f64 {
        let (p, q) = (self.forest.group[d.p as usize] as usize, self.forest.group[d.q as usize] as usize);
        let g = 1.0 / d.series;
        let mut rhs = vec![0.0; self.forest.groups];
        rhs[p] += g;
        rhs[q] -= g;
        self.system.solve(&mut rhs);
        (g - g * (rhs[p] - rhs[q])).abs()
    }

    /// Whether links or ties lead from one group to another.
    pub(super) fn joined(&mut self, p: u32, q: u32) -> bool {
        let (a, b) = (self.forest.group[p as usize], self.forest.group[q as usize]);
        if a == b || self.pins.is_empty() {
            return true;
        }
        let sets = self.islands.get_or_insert_with(|| {
            let mut sets = Sets::new(self.forest.groups);
            for &(a, b) in &self.system.edges()[..self.links.len()] {
                sets.union(a, b);
            }
            sets
        });
        sets.find(a) == sets.find(b)
    }

    /// Resistance between two groups; `None` where nothing ties one to the other.
    pub(super) fn between(&mut self, p: u32, q: u32) -> Option<f64> {
        let (a, b) = (self.forest.group[p as usize], self.forest.group[q as usize]);
        if a == b {
            return Some(0.0);
        }
        if !self.joined(p, q) {
            return None;
        }
        let mut rhs = vec![0.0; self.forest.groups];
        rhs[a as usize] += 1.0;
        rhs[b as usize] -= 1.0;
        self.system.solve(&mut rhs);
        Some(rhs[a as usize] - rhs[b as usize])
    }

    /// Nodes below `node` in the forest, itself included, sorted.
    fn subtree(&self, node: u32, near: &Neighbours) -> Vec<u32> {
        let mut side = vec![node];
        let mut at = 0;
        while at < side.len() {
            let here = side[at];
            at += 1;
            let below = near.tree.of(here).iter().map(|&(_, other)| other);
            side.extend(below.filter(|&other| self.forest.parent[other as usize] == here && other != here));
        }
        side.sort_unstable();
        side
    }
}

/// The level at which a diode's terminals stand, within tolerance, were it to carry nothing.
pub(super) fn at_level(d: &Diode, part: &Passive, potentials: &[Dd], volts: f64) -> Option<State> {
    let v = part.across(d, potentials);
    let room = NOTHING * (d.scale(potentials) + FLOOR * volts);
    if (v - d.forward.into()).abs() <= room {
        Some(State::Forward)
    } else if d.reverse.is_finite() && (v + d.reverse.into()).abs() <= room {
        Some(State::Reverse)
    } else {
        None
    }
}

/// What meets at each group, made only where it is asked for.
struct Neighbours {
    links: Adjacency,
    tree: Adjacency,
    chords: Adjacency,
}

impl Neighbours {
    fn new(solve: &Solve<'_>) -> Self {
        let nodes = solve.part.nodes;
        let forest = &solve.forest;
        let tree = (0..nodes as u32).filter(|&n| forest.up[n as usize] != NONE);
        let chords = forest.chords.iter().map(|&c| (solve.ties[c as usize].a, solve.ties[c as usize].b));
        Neighbours {
            links: Adjacency::new(nodes, solve.links.iter().map(|l| (l.0, l.1))),
            tree: Adjacency::new(nodes, tree.map(|n| (n, forest.parent[n as usize]))),
            chords: Adjacency::new(nodes, chords),
        }
    }
}
