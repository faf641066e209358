//! One part of positive resistances and smooth monotone branches. Its answer is the minimum of a strictly convex
//! function of the potentials (the co-content: Millar, Phil. Mag. 42, 1951), so Newton's method with a line search
//! finds it from anywhere; a limited iteration on the curves (Nagel, UCB/ERL M520, 1975) takes it near first,
//! because that needs a dozen steps where the search alone may need hundreds.

use super::curve::{Curve, Point};
use super::double_double::Dd;
use super::forest::{Forest, Sets, Tie};
use super::laplacian::Laplacian;
use super::outcome::{Place, Solution};
use super::parts::{Built, Piece};
use super::passive::{Diode, Passive};
use super::rails::Rails;
use super::smooth::{Smooth, Smoothness};

/// Rounds of changing the states of corners at most.
const MOST_STATES: usize = 40;
/// Steps of the limited iteration, then of the search.
const MOST_LIMITED: usize = 60;
const MOST_STEPS: usize = 600;

/// Solves the part into `smooth`; says whether that settled.
pub(super) fn solve(
    rails: &Rails,
    piece: &Piece,
    built: &Built,
    solution: &Solution,
    laws: &[Smoothness],
    smooth: &mut Smooth,
) -> bool {
    let part = &built.part;
    let law = |k: usize| laws[built.diodes[k] as usize];
    let place = |k: usize| solution.places[built.diodes[k] as usize];
    let mut start = vec![Dd::ZERO];
    for &group in &piece.groups {
        let Some(&node) = rails.nodes_of(group).first() else { return false };
        let u = solution.sample.0[node as usize];
        start.push(if u.is_finite() { Dd::from(u) - rails.forest.offset[node as usize] } else { Dd::ZERO });
    }
    let currents: Vec<f64> = built.diodes.iter().map(|&b| solution.sample.1[b as usize]).collect();
    let mut corners: Vec<Corner> = (0..part.diodes.len())
        .map(|k| match (law(k), place(k)) {
            (Smoothness::Curve(curve), _) => Corner::Smooth(curve),
            (_, Place::Conducting | Place::Open) if currents[k] >= 0.0 => Corner::At(part.diodes[k].forward),
            (_, Place::Breakdown) => Corner::At(-part.diodes[k].reverse),
            _ => Corner::Off,
        })
        .collect();
    for round in 0..MOST_STATES {
        let mut descent = Descent::new(part, &corners, start.clone(), &currents);
        let settled = descent.run();
        smooth.solves += descent.system.factorizations;
        if !settled {
            return false;
        }
        let wrong = descent.wrong_corners(&corners);
        if wrong.is_empty() {
            descent.write(rails, piece, built, &corners, smooth);
            return true;
        }
        // all at once first, then one at a time, lowest number first, which cannot go round for ever
        let few = if round < 8 { wrong.len() } else { 1 };
        for (k, corner) in wrong.into_iter().take(few) {
            corners[k] = corner;
        }
        start = descent.potentials();
    }
    false
}

/// What a junction of the part is in one round.
#[derive(Clone, Copy)]
enum Corner {
    Smooth(Curve),
    /// Pins its inner voltage.
    At(f64),
    /// Carries nothing.
    Off,
}

/// Newton's method on the potentials of clusters: groups tied by corners without resistance.
struct Descent<'a> {
    part: &'a Passive,
    ties: Vec<Tie>,
    tie_diode: Vec<usize>,
    forest: Forest,
    /// `(p, q, opposing voltage, ohms)`.
    links: Vec<(u32, u32, Dd, f64)>,
    /// Number of the smooth diode, its ends, its curve.
    live: Vec<(usize, Diode, Curve)>,
    /// Where each stands on its curve.
    points: Vec<Point>,
    system: Laplacian,
    conductances: Vec<f64>,
    pins: usize,
    /// Potential of each cluster.
    at: Vec<Dd>,
    volts: f64,
}

impl<'a> Descent<'a> {
    fn new(part: &'a Passive, corners: &[Corner], start: Vec<Dd>, currents: &[f64]) -> Self {
        let (mut ties, mut tie_diode, mut live, mut points) =
            (Vec::new(), Vec::new(), Vec::new(), Vec::new());
        let mut links: Vec<_> = part.resistors.iter().map(|r| (r.p, r.q, r.delta, r.ohms)).collect();
        for (k, (d, corner)) in part.diodes.iter().zip(corners).enumerate() {
            match *corner {
                Corner::Off => {}
                Corner::At(level) if d.series > 0.0 => {
                    links.push((d.p, d.q, d.delta - level.into(), d.series))
                }
                Corner::At(level) => {
                    if d.p != d.q {
                        ties.push(Tie { a: d.p, b: d.q, volts: Dd::from(level) - d.delta });
                        tie_diode.push(k);
                    }
                }
                Corner::Smooth(curve) => {
                    let stands = part.across(d, &start).round();
                    let v = if currents[k] != 0.0 { curve.voltage(currents[k]) } else { stands };
                    points.push(curve.at(v));
                    live.push((k, *d, curve));
                }
            }
        }
        let forest = Forest::new(part.nodes, &ties);
        let cluster = |n: u32| forest.group[n as usize];
        let mut edges: Vec<(u32, u32)> = links.iter().map(|l| (cluster(l.0), cluster(l.1))).collect();
        edges.extend(live.iter().map(|(_, d, _)| (cluster(d.p), cluster(d.q))));
        let mut sets = Sets::new(forest.groups);
        for &(a, b) in &edges {
            sets.union(a, b);
        }
        let pinned: Vec<u32> = (1..forest.groups as u32).filter(|&c| sets.find(c) == c).collect();
        edges.extend(pinned.iter().map(|&c| (c, 0)));
        let mut at = vec![Dd::ZERO; forest.groups];
        for (n, &group) in forest.group.iter().enumerate().rev() {
            at[group as usize] = start[n] - forest.offset[n];
        }
        at[0] = Dd::ZERO;
        let scales = part.scales();
        let mut conductances: Vec<f64> = links.iter().map(|l| 1.0 / l.3).collect();
        conductances.resize(edges.len(), scales.least);
        Descent {
            part,
            ties,
            tie_diode,
            pins: pinned.len(),
            links,
            live,
            points,
            system: Laplacian::new(forest.groups, edges),
            conductances,
            at,
            volts: scales.volts,
            forest,
        }
    }

    fn run(&mut self) -> bool {
        if self.system.too_large {
            return false;
        }
        let start = self.at.clone();
        if self.limited() && self.search() {
            return true;
        }
        // once more by the search alone
        self.at = start;
        self.search()
    }

    fn potential(&self, n: u32) -> Dd {
        self.at[self.forest.group[n as usize] as usize] + self.forest.offset[n as usize]
    }

    fn potentials(&self) -> Vec<Dd> {
        (0..self.part.nodes as u32).map(|n| self.potential(n)).collect()
    }

    fn across(&self, d: &Diode) -> f64 {
        (self.potential(d.p) - self.potential(d.q) + d.delta).round()
    }

    /// Net current into each group at the present potentials, each diode carrying `current(k, v)`, and the sum of the
    /// terms that meet there.
    fn net(&self, current: impl Fn(usize, f64) -> f64) -> (Vec<Dd>, Vec<f64>) {
        let mut net = self.part.injected.clone();
        let mut gross: Vec<f64> = net.iter().map(|i| i.abs()).collect();
        let mut add = |p: u32, q: u32, i: Dd| {
            net[p as usize] += -i;
            net[q as usize] += i;
            gross[p as usize] += i.abs();
            gross[q as usize] += i.abs();
        };
        for &(p, q, delta, ohms) in &self.links {
            add(p, q, (self.potential(p) - self.potential(q) + delta).over(ohms));
        }
        for (k, (_, d, _)) in self.live.iter().enumerate() {
            add(d.p, d.q, current(k, self.across(d)).into());
        }
        (net, gross)
    }

    /// The same, summed over clusters.
    fn by_cluster(&self, net: &[Dd]) -> Vec<f64> {
        let mut sums = vec![Dd::ZERO; self.forest.groups];
        for (&group, &i) in self.forest.group.iter().zip(net) {
            sums[group as usize] += i;
        }
        sums.into_iter().map(Dd::round).collect()
    }

    /// Change of the cluster potentials that would balance `net` with the diodes' conductances at their points.
    fn step(&mut self, net: &[Dd], tame: bool) -> Vec<f64> {
        let from = self.links.len();
        for ((_, _, curve), (point, g)) in
            self.live.iter().zip(self.points.iter().zip(&mut self.conductances[from..]))
        {
            *g = if tame { point.g.max(curve.least_conductance(point.v)) } else { curve.proper(point) };
        }
        self.system.factor(&self.conductances, !self.part.is_large());
        let mut step = self.by_cluster(net);
        self.system.solve(&mut step);
        step
    }

    fn move_by(&mut self, step: &[f64], share: f64) {
        for (u, &s) in self.at.iter_mut().zip(step) {
            *u += (share * s).into();
        }
    }

    /// Tangents at points of the curves, the points moving on by current where the curve is steep.
    fn limited(&mut self) -> bool {
        for _ in 0..MOST_LIMITED {
            let points = self.points.clone();
            let tangent = |curve: &Curve, k: usize, v: f64| {
                points[k].i + points[k].g.max(curve.least_conductance(points[k].v)) * (v - points[k].v)
            };
            let (net, _) = self.net(|k, v| tangent(&self.live[k].2, k, v));
            let step = self.step(&net, true);
            if !step.iter().all(|s| s.is_finite()) {
                return false;
            }
            self.move_by(&step, 1.0);
            let mut farthest = 0.0f64;
            let mut next_points = Vec::with_capacity(self.live.len());
            for (k, (_, d, curve)) in self.live.iter().enumerate() {
                let next = limit(curve, &points[k], self.across(d));
                let point = curve.at(next);
                let missed = (tangent(curve, k, self.across(d)) - point.i).abs()
                    / (point.i.abs() + curve.saturation());
                farthest = farthest.max((next - self.across(d)).abs() / curve.slope).max(missed);
                next_points.push(point);
            }
            self.points = next_points;
            if farthest <= 0.3 {
                return true;
            }
        }
        true
    }

    /// Newton's method with a line search on the derivative along the step, which a convex function cannot fool.
    fn search(&mut self) -> bool {
        for _ in 0..MOST_STEPS {
            self.stand();
            let (net, _) = self.net(|k, _| self.points[k].i);
            let step = self.step(&net, false);
            let slope = dot(&self.by_cluster(&net), &step);
            if !slope.is_finite() {
                return false;
            }
            let before = self.at.clone();
            let mut share = 1.0;
            for _ in 0..60 {
                self.at.clone_from(&before);
                self.move_by(&step, share);
                let (net, _) = self.net(|k, v| self.live[k].2.current(v));
                let here = dot(&self.by_cluster(&net), &step);
                // the derivative is minus this: negative values mean the minimum was passed
                if here >= -0.5 * slope || self.is_small(&step, share) {
                    break;
                }
                share *= (slope / (slope - here)).clamp(0.1, 0.7);
            }
            // the next step would be the square of this one
            if self.is_small(&step, 1.0) {
                self.stand();
                return self.balances();
            }
        }
        false
    }

    /// Puts the points of all curves under the present potentials.
    fn stand(&mut self) {
        for k in 0..self.live.len() {
            let (_, d, curve) = &self.live[k];
            self.points[k] = curve.at(self.across(d));
        }
    }

    /// Whether a step moves nothing that the answer shows.
    fn is_small(&self, step: &[f64], share: f64) -> bool {
        let at = |n: u32| step[self.forest.group[n as usize] as usize];
        let largest = step.iter().fold(0.0f64, |m, s| m.max(s.abs()));
        largest * share <= 1e-9 * self.volts
            && self.live.iter().all(|(_, d, c)| (share * (at(d.p) - at(d.q))).abs() <= 1e-9 * c.slope)
    }

    fn balances(&self) -> bool {
        let (net, gross) = self.net(|k, _| self.points[k].i);
        let mut terms = vec![0.0; self.forest.groups];
        for (&group, &i) in self.forest.group.iter().zip(&gross) {
            terms[group as usize] += i;
        }
        // a conductance turns the rounding of a potential into current
        for ((a, b), g) in self.system.edges().iter().zip(&self.conductances) {
            terms[*a as usize] += 1e-6 * g * self.volts;
            terms[*b as usize] += 1e-6 * g * self.volts;
        }
        let net = self.by_cluster(&net);
        net.iter().zip(&terms).skip(1).all(|(i, t)| i.abs() <= 1e-8 * t)
    }

    /// Corners whose state does not agree, and what they should be.
    fn wrong_corners(&self, corners: &[Corner]) -> Vec<(usize, Corner)> {
        let mut wrong = Vec::new();
        let mut tied = None;
        let mut link = self.part.resistors.len();
        for (k, (d, corner)) in self.part.diodes.iter().zip(corners).enumerate() {
            let v = self.across(d);
            let room = 1e-9 * self.volts;
            match *corner {
                Corner::Smooth(_) => {}
                Corner::Off if v > d.forward + room => wrong.push((k, Corner::At(d.forward))),
                Corner::Off if v < -d.reverse - room => wrong.push((k, Corner::At(-d.reverse))),
                Corner::Off => {}
                Corner::At(level) => {
                    let i = if d.series > 0.0 {
                        link += 1;
                        (v - level) / d.series
                    } else if d.p == d.q {
                        0.0
                    } else {
                        tied.get_or_insert_with(|| self.tie_currents())[k]
                    };
                    let sign = if level < 0.0 { -1.0 } else { 1.0 };
                    if sign * i < -1e-12 * self.part.scales().most * self.volts {
                        wrong.push((k, Corner::Off));
                    }
                }
            }
        }
        debug_assert!(link <= self.links.len());
        wrong
    }

    /// Currents of corners that tie, by Kirchhoff's law from the leaves of the forest.
    fn tie_currents(&self) -> Vec<f64> {
        let (mut net, _) = self.net(|k, _| self.points[k].i);
        let mut currents = vec![0.0; self.part.diodes.len()];
        for &node in self.forest.order.iter().rev() {
            let tie = self.forest.up[node as usize];
            if tie == super::forest::NONE {
                continue;
            }
            let leaving = net[node as usize];
            net[self.forest.parent[node as usize] as usize] += leaving;
            let sign = if self.ties[tie as usize].a == node { 1.0 } else { -1.0 };
            currents[self.tie_diode[tie as usize]] = sign * leaving.round();
        }
        currents
    }

    /// Islands whose potential double precision cannot tell: a diode far in reverse answers to no voltage.
    fn islands(&self) -> Sets {
        let mut sets = Sets::new(self.forest.groups);
        let proper = self.system.edges().len() - self.pins;
        for &(a, b) in &self.system.edges()[..self.links.len()] {
            sets.union(a, b);
        }
        let diodes = &self.system.edges()[self.links.len()..proper];
        for ((&(a, b), (_, _, curve)), point) in diodes.iter().zip(&self.live).zip(&self.points) {
            if !curve.is_saturated(point.v) {
                sets.union(a, b);
            }
        }
        sets
    }

    fn write(&self, rails: &Rails, piece: &Piece, built: &Built, corners: &[Corner], smooth: &mut Smooth) {
        let mut sets = self.islands();
        let mut root = |n: u32| sets.find(self.forest.group[n as usize]);
        for (n, &group) in piece.groups.iter().enumerate() {
            let is_open = root(n as u32 + 1) != 0;
            for &node in rails.nodes_of(group) {
                let u = self.potential(n as u32 + 1) + rails.forest.offset[node as usize];
                smooth.potentials[node as usize] = if is_open { f64::NAN } else { u.round() };
            }
        }
        for ((k, d, _), point) in self.live.iter().zip(&self.points) {
            if root(d.p) == root(d.q) && matches!(corners[*k], Corner::Smooth(_)) {
                smooth.junctions[built.diodes[*k] as usize] = (point.v, point.i);
            }
        }
    }
}

/// Where on its curve the next tangent is laid: at the voltage, or where the curve rises steeply at the current that
/// the tangent foretells.
pub(super) fn limit(curve: &Curve, point: &Point, v: f64) -> f64 {
    let foretold = point.i + point.g.max(curve.least_conductance(point.v)) * (v - point.v);
    let saturation = curve.saturation();
    if v > point.v + curve.slope && v > 0.0 {
        return curve.voltage(foretold.max(saturation)).min(v);
    }
    match curve.tail {
        Some(tail) if v < point.v - tail.slope => {
            let least = 2.0 * saturation + 1e-6 * tail.ln_current.exp();
            curve.voltage(foretold.min(-least)).max(v)
        }
        _ => v,
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).skip(1).map(|(x, y)| x * y).sum()
}
