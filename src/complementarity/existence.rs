//! Whether a part has a solution at all, decided on the graph before any factorization (Minty 1960): there is
//! none exactly where junctions and sources without resistance form a loop that drives unlimited current, or
//! where sources push current into a set of nodes that nothing lets out.

use super::decimal::RELATIVE;
use super::flow::Flow;
use super::forest::{NONE, Sets};
use super::passive::Passive;

/// Why there is no solution.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Obstacle {
    /// Diodes of the loop in the direction of the current, with `true` where it is driven into breakdown, and the
    /// voltage left over.
    Loop { diodes: Vec<(u32, bool)>, gap: f64 },
    /// Groups that gain (`excess` > 0) or lose more than junctions let through.
    Cut { inside: Vec<bool>, excess: f64 },
}

/// The obstacle, if there is one.
pub(super) fn obstacle(part: &Passive) -> Option<Obstacle> {
    driven_loop(part).or_else(|| stuck_current(part))
}

/// Bounds `u(to) ≤ u(from) + cost` that a diode of no series resistance sets.
struct Bound {
    from: u32,
    to: u32,
    cost: f64,
    room: f64,
    diode: u32,
    reverse: bool,
}

fn bounds(part: &Passive) -> Vec<Bound> {
    let mut bounds = Vec::with_capacity(part.diodes.len());
    for (n, d) in part.diodes.iter().enumerate().filter(|(_, d)| d.series == 0.0) {
        let room = RELATIVE * (d.delta.abs() + d.forward);
        let cost = (super::double_double::Dd::from(d.forward) - d.delta).round();
        bounds.push(Bound { from: d.q, to: d.p, cost, room, diode: n as u32, reverse: false });
        if d.reverse.is_finite() {
            let cost = (super::double_double::Dd::from(d.reverse) + d.delta).round();
            let room = RELATIVE * (d.delta.abs() + d.reverse);
            bounds.push(Bound { from: d.p, to: d.q, cost, room, diode: n as u32, reverse: true });
        }
    }
    bounds
}

/// A loop of negative cost among the bounds, by the queue form of Bellman and Ford.
fn driven_loop(part: &Passive) -> Option<Obstacle> {
    let bounds = bounds(part);
    if let Some(b) = bounds.iter().find(|b| b.from == b.to && b.cost < -b.room) {
        return Some(Obstacle::Loop { diodes: vec![(b.diode, b.reverse)], gap: -b.cost });
    }
    let mut search = Search::new(part.nodes, &bounds);
    search.run().map(|around| {
        let gap = -around.iter().map(|&b| bounds[b as usize].cost).sum::<f64>();
        let diodes = around.iter().map(|&b| (bounds[b as usize].diode, bounds[b as usize].reverse));
        Obstacle::Loop { diodes: diodes.collect(), gap }
    })
}

struct Search<'a> {
    bounds: &'a [Bound],
    start: Vec<u32>,
    out: Vec<u32>,
    best: Vec<f64>,
    by: Vec<u32>,
}

impl<'a> Search<'a> {
    fn new(nodes: usize, bounds: &'a [Bound]) -> Self {
        let mut start = vec![0u32; nodes + 1];
        for b in bounds {
            start[b.from as usize + 1] += 1;
        }
        for n in 0..nodes {
            start[n + 1] += start[n];
        }
        let mut next = start.clone();
        let mut out = vec![0; bounds.len()];
        for (n, b) in bounds.iter().enumerate() {
            out[next[b.from as usize] as usize] = n as u32;
            next[b.from as usize] += 1;
        }
        Search { bounds, start, out, best: vec![0.0; nodes], by: vec![NONE; nodes] }
    }

    /// Bounds around a driven loop, in the direction of its current.
    fn run(&mut self) -> Option<Vec<u32>> {
        let nodes = self.best.len();
        let mut queued = vec![true; nodes];
        let mut queue: std::collections::VecDeque<u32> = (0..nodes as u32).collect();
        let mut improved = 0usize;
        while let Some(node) = queue.pop_front() {
            queued[node as usize] = false;
            for k in self.start[node as usize]..self.start[node as usize + 1] {
                let number = self.out[k as usize];
                let b = &self.bounds[number as usize];
                let value = self.best[node as usize] + b.cost;
                let to = b.to as usize;
                let room = b.room + RELATIVE * self.best[to].abs();
                if b.from == b.to || value >= self.best[to] - room {
                    continue;
                }
                self.best[to] = value;
                self.by[to] = number;
                improved += 1;
                if improved.is_multiple_of(nodes.max(16))
                    && let Some(around) = self.circle()
                {
                    return Some(around);
                }
                if !queued[to] {
                    queued[to] = true;
                    queue.push_back(b.to);
                }
            }
        }
        self.circle()
    }

    /// A circle among the bounds that set the present values.
    fn circle(&self) -> Option<Vec<u32>> {
        let mut seen = vec![0u32; self.best.len()];
        for start in 0..self.best.len() {
            let mut node = start;
            while seen[node] == 0 && self.by[node] != NONE {
                seen[node] = start as u32 + 1;
                node = self.bounds[self.by[node] as usize].from as usize;
            }
            if seen[node] == start as u32 + 1 && self.by[node] != NONE {
                return Some(self.around(node));
            }
            seen[start] = seen[start].max(start as u32 + 1);
        }
        None
    }

    fn around(&self, first: usize) -> Vec<u32> {
        let mut found = Vec::new();
        let mut node = first;
        loop {
            let number = self.by[node];
            found.push(number);
            node = self.bounds[number as usize].from as usize;
            if node == first || found.len() > self.best.len() {
                return found;
            }
        }
    }
}

/// A set of groups whose sources push more in than junctions let out, or draw more than they let in.
fn stuck_current(part: &Passive) -> Option<Obstacle> {
    let most = part.injected.iter().skip(1).map(|i| i.abs()).fold(0.0, f64::max);
    if most == 0.0 {
        return None;
    }
    let mut sets = Sets::new(part.nodes);
    for r in &part.resistors {
        sets.union(r.p, r.q);
    }
    for d in part.diodes.iter().filter(|d| d.reverse.is_finite()) {
        sets.union(d.p, d.q);
    }
    let cluster: Vec<u32> = (0..part.nodes as u32).map(|n| sets.find(n)).collect();
    let mut supply = vec![super::double_double::Dd::ZERO; part.nodes];
    let mut gross = vec![0.0; part.nodes];
    for (n, &i) in part.injected.iter().enumerate() {
        supply[cluster[n] as usize] += i;
        gross[cluster[n] as usize] += i.abs();
    }
    let supply: Vec<f64> = supply
        .into_iter()
        .zip(&gross)
        .map(|(s, g)| if s.abs() <= RELATIVE * g { 0.0 } else { s.round() })
        .collect();
    [1.0, -1.0].into_iter().find_map(|sign| unshipped(part, &cluster, &supply, sign, most))
}

/// Ships what sources push in (`sign` 1) or draw out (−1); the set that keeps some is the obstacle.
fn unshipped(part: &Passive, cluster: &[u32], supply: &[f64], sign: f64, most: f64) -> Option<Obstacle> {
    let (source, sink) = (part.nodes as u32, part.nodes as u32 + 1);
    let wanted: f64 = supply.iter().skip(1).map(|s| (s * sign).max(0.0)).sum();
    if wanted == 0.0 {
        return None;
    }
    let mut flow = Flow::new(part.nodes + 2, RELATIVE * most);
    for d in part.diodes.iter().filter(|d| !d.reverse.is_finite()) {
        let (a, b) = (cluster[d.p as usize], cluster[d.q as usize]);
        let (from, to) = if sign > 0.0 { (a, b) } else { (b, a) };
        if from != to {
            flow.add(from, to, f64::INFINITY, 0.0);
        }
    }
    for (c, s) in supply.iter().enumerate().skip(1).map(|(c, s)| (c as u32, s * sign)) {
        if s > 0.0 {
            flow.add(source, c, s, 0.0);
        } else if s < 0.0 {
            flow.add(c, sink, -s, 0.0);
        }
    }
    flow.add(0, sink, f64::INFINITY, 0.0);
    let shipped = flow.greatest(source, sink);
    if wanted - shipped <= RELATIVE * wanted {
        return None;
    }
    let reachable = flow.reachable(source);
    let inside = cluster.iter().map(|&c| reachable[c as usize]).collect();
    Some(Obstacle::Cut { inside, excess: sign * (wanted - shipped) })
}
