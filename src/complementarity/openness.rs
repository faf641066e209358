//! What the laws leave open, as feasible intervals: currents that can shift around loops of branches whose
//! voltages stand whatever they carry, and potentials of islands that only blocking junctions tie to the rest.

use super::flow::Flow;
use super::forest::{Adjacency, Sets};
use super::outcome::Interval;
use super::passive::{Passive, Point};
use std::cmp::{Ordering, Reverse};
use std::collections::BinaryHeap;

/// Share of the largest current or voltage below which an interval is a point.
const POINT: f64 = 1e-11;
/// Loops of more arcs than this are bounded only by what flows into them.
const TOO_MANY: usize = 4000;

/// A branch whose voltage stays as it is while its current changes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Arc {
    pub(super) from: u32,
    pub(super) to: u32,
    /// Current in the sample.
    pub(super) current: f64,
    /// How far the current may rise and fall.
    pub(super) rise: f64,
    pub(super) fall: f64,
    /// No voltage stands across it: current that merely circulates through such arcs is left out.
    pub(super) idle: bool,
    /// An inductor or 0 Ω, through which current may circulate in either direction.
    pub(super) short: bool,
}

/// Interval of each arc's current; `None` where it cannot change.
pub(super) fn current_ranges(nodes: usize, arcs: &[Arc]) -> Vec<Option<Interval>> {
    let mut ranges = vec![None; arcs.len()];
    for block in blocks(nodes, arcs) {
        ranges_in_block(arcs, &block, &mut ranges);
    }
    ranges
}

/// Arcs grouped by two-edge-connected components: an arc that is a bridge is in none.
fn blocks(nodes: usize, arcs: &[Arc]) -> Vec<Vec<u32>> {
    let adjacency = Adjacency::new(nodes, arcs.iter().map(|a| (a.from, a.to)));
    let bridge = bridges(nodes, arcs, &adjacency);
    let mut sets = Sets::new(nodes);
    for (arc, _) in arcs.iter().zip(&bridge).filter(|(a, bridge)| !**bridge && a.from != a.to) {
        sets.union(arc.from, arc.to);
    }
    let mut by_root: std::collections::BTreeMap<u32, Vec<u32>> = Default::default();
    for (n, arc) in arcs.iter().enumerate() {
        if arc.from != arc.to && !bridge[n] {
            by_root.entry(sets.find(arc.from)).or_default().push(n as u32);
        }
    }
    by_root.into_values().collect()
}

/// Bridges of a multigraph by depth-first search (Tarjan 1974), without recursion; parallel arcs are none.
fn bridges(nodes: usize, arcs: &[Arc], adjacency: &Adjacency) -> Vec<bool> {
    let mut bridge = vec![false; arcs.len()];
    let mut number = vec![u32::MAX; nodes];
    let mut low = vec![u32::MAX; nodes];
    let mut count = 0;
    for root in 0..nodes as u32 {
        if number[root as usize] != u32::MAX || adjacency.of(root).is_empty() {
            continue;
        }
        let mut stack = vec![(root, u32::MAX, 0usize)];
        while let Some((node, by, at)) = stack.pop() {
            if at == 0 {
                number[node as usize] = count;
                low[node as usize] = count;
                count += 1;
            }
            let Some(&(arc, other)) = adjacency.of(node).get(at) else {
                if let Some(&(parent, _, _)) = stack.last() {
                    low[parent as usize] = low[parent as usize].min(low[node as usize]);
                    bridge[by as usize] = low[node as usize] > number[parent as usize];
                }
                continue;
            };
            stack.push((node, by, at + 1));
            if arc == by || other == node {
                continue;
            }
            if number[other as usize] == u32::MAX {
                stack.push((other, arc, 0));
            } else {
                low[node as usize] = low[node as usize].min(number[other as usize]);
            }
        }
    }
    bridge
}

fn ranges_in_block(arcs: &[Arc], block: &[u32], ranges: &mut [Option<Interval>]) {
    let mut names: Vec<u32> =
        block.iter().flat_map(|&n| [arcs[n as usize].from, arcs[n as usize].to]).collect();
    names.sort_unstable();
    names.dedup();
    let local = |node: u32| names.binary_search(&node).unwrap_or(0) as u32;
    let gross = block.iter().map(|&n| arcs[n as usize].current.abs()).fold(0.0, f64::max);
    let mut flow = Flow::new(names.len(), 1e-13 * gross);
    for &n in block {
        let arc = &arcs[n as usize];
        flow.add(local(arc.from), local(arc.to), arc.rise, arc.fall);
    }
    let mixed = block.iter().any(|&n| !arcs[n as usize].short);
    let whole = flow.capacities();
    let idle = Idle { arcs, block, local: &local, nodes: names.len() };
    for (k, &n) in block.iter().enumerate() {
        let arc = &arcs[n as usize];
        let (a, b) = (local(arc.from), local(arc.to));
        let mut bound = |from, to, against: f64| {
            flow.restore(&whole);
            flow.close(2 * k as u32);
            match block.len() > TOO_MANY {
                true => f64::INFINITY,
                false if arc.idle && mixed => idle.greatest(&mut flow, from, to, against),
                false => flow.greatest(from, to),
            }
        };
        let up = bound(b, a, -arc.current).min(arc.rise);
        let down = bound(a, b, arc.current).min(arc.fall);
        let interval = Interval { low: arc.current - down, high: arc.current + up };
        let ends = [interval.low, interval.high, gross];
        let size = ends.into_iter().filter(|x| x.is_finite()).fold(0.0, |m: f64, x| m.max(x.abs()));
        if interval.high - interval.low > POINT * size {
            ranges[n as usize] = Some(snapped(interval, size));
        }
    }
}

/// Ends that are zero but for rounding are zero.
fn snapped(interval: Interval, size: f64) -> Interval {
    let snap = |x: f64| if x.abs() <= POINT * size { 0.0 } else { x };
    Interval { low: snap(interval.low), high: snap(interval.high) }
}

/// Arcs without voltage can pass any current around among themselves; such circulation is left out.
struct Idle<'a, L: Fn(u32) -> u32> {
    arcs: &'a [Arc],
    block: &'a [u32],
    local: &'a L,
    nodes: usize,
}

impl<L: Fn(u32) -> u32> Idle<'_, L> {
    /// How much more an arc without voltage can carry if that returns from `from` to `to`. As long as it only undoes
    /// the `against` that runs the other way, nothing circulates; beyond that, other such arcs may not carry it back.
    fn greatest(&self, flow: &mut Flow, from: u32, to: u32, against: f64) -> f64 {
        let mut undone = 0.0;
        if against > 0.0 {
            undone = flow.at_most(from, to, against);
            if undone < against {
                return undone;
            }
        }
        if !self.reroute(flow, from, to) {
            return undone;
        }
        // a way back is cut at either end; which end leaves more depends on what else is to be undone
        let whole = flow.capacities();
        let mut most = 0.0f64;
        for last in [true, false] {
            flow.restore(&whole);
            self.forbid_return(flow, from, to, last);
            most = most.max(flow.greatest(from, to));
        }
        undone + most
    }

    /// Sends what runs straight back from `from` to `to` another way; `false` where some of it has no other.
    fn reroute(&self, flow: &mut Flow, from: u32, to: u32) -> bool {
        let mut all = true;
        for (k, &n) in self.block.iter().enumerate() {
            let arc = &self.arcs[n as usize];
            let ends = ((self.local)(arc.from), (self.local)(arc.to));
            let beside = if ends == (from, to) { arc.current } else { -arc.current };
            if arc.idle
                && (ends == (from, to) || ends == (to, from))
                && beside > 0.0
                && !flow.closed(2 * k as u32)
            {
                flow.close(2 * k as u32);
                all &= flow.at_most(from, to, beside) >= beside * (1.0 - POINT);
            }
        }
        all
    }

    /// Closes the last (or first) arc of every way without voltage from `from` to `to`. Undoing a current is no such
    /// way, but ends where nothing is left to undo.
    fn forbid_return(&self, flow: &mut Flow, from: u32, to: u32, last: bool) {
        let ahead = self.reach(from, false);
        let behind = self.reach(to, true);
        let closes = |a: u32, b: u32| match last {
            true => ahead[a as usize] && b == to,
            false => behind[b as usize] && a == from,
        };
        for (k, &n) in self.block.iter().enumerate() {
            let arc = &self.arcs[n as usize];
            if !arc.idle {
                continue;
            }
            let (a, b) = ((self.local)(arc.from), (self.local)(arc.to));
            let [there, back] = ways(arc);
            if (there && closes(a, b)) || arc.current < 0.0 {
                flow.limit(2 * k as u32, (-arc.current).max(0.0));
            }
            if arc.fall == f64::INFINITY && ((back && closes(b, a)) || arc.current > 0.0) {
                flow.limit(2 * k as u32 + 1, arc.current.max(0.0));
            }
        }
    }

    /// Nodes that new current through arcs without voltage leads to from `start`; with `back`, from which it leads
    /// there.
    fn reach(&self, start: u32, back: bool) -> Vec<bool> {
        let mut seen = vec![false; self.nodes];
        let mut queue = vec![start];
        seen[start as usize] = true;
        while let Some(node) = queue.pop() {
            for &n in self.block {
                let arc = &self.arcs[n as usize];
                if !arc.idle {
                    continue;
                }
                let (a, b) = ((self.local)(arc.from), (self.local)(arc.to));
                let (a, b) = if back { (b, a) } else { (a, b) };
                let [there, reverse] = ways(arc);
                for (near, far, open) in [(a, b, there), (b, a, reverse)] {
                    if open && near == node && !seen[far as usize] {
                        seen[far as usize] = true;
                        queue.push(far);
                    }
                }
            }
        }
        seen
    }
}

/// Whether more current along an arc, and against it, would be new current rather than less of the old.
fn ways(arc: &Arc) -> [bool; 2] {
    let both = arc.fall == f64::INFINITY;
    [!both || arc.current >= 0.0, both && arc.current <= 0.0]
}

/// Takes out of the sample what merely circulates through arcs without voltage: currents of the arcs, changed.
pub(super) fn cancel_idle(nodes: usize, arcs: &mut [Arc]) {
    let idle: Vec<usize> = (0..arcs.len()).filter(|&n| arcs[n].idle && arcs[n].from != arcs[n].to).collect();
    let junctions = idle.iter().any(|&n| arcs[n].fall.is_finite());
    if !junctions {
        return;
    }
    let mut out: Vec<Vec<usize>> = vec![Vec::new(); nodes];
    for &n in &idle {
        out[arcs[n].from as usize].push(n);
        out[arcs[n].to as usize].push(n);
    }
    while let Some(circle) = circle(arcs, &idle, &out) {
        let least = circle.iter().map(|&n| arcs[n].current.abs()).fold(f64::INFINITY, f64::min);
        for n in circle {
            let arc = &mut arcs[n];
            let rest = arc.current.abs() - least;
            arc.current = rest * arc.current.signum();
            if arc.fall.is_finite() {
                arc.fall = arc.current;
            }
        }
    }
}

/// Arcs around a circle of currents, found by walking along them without recursion.
fn circle(arcs: &[Arc], idle: &[usize], out: &[Vec<usize>]) -> Option<Vec<usize>> {
    let ahead = |n: usize| if arcs[n].current > 0.0 { arcs[n].to } else { arcs[n].from };
    let behind = |n: usize| if arcs[n].current > 0.0 { arcs[n].from } else { arcs[n].to };
    let mut done = vec![false; out.len()];
    for &start in idle.iter().filter(|&&n| arcs[n].current != 0.0) {
        let mut path: Vec<usize> = Vec::new();
        let mut on_path = std::collections::BTreeMap::from([(behind(start), 0)]);
        let mut node = behind(start);
        loop {
            let next = out[node as usize]
                .iter()
                .copied()
                .find(|&n| arcs[n].current != 0.0 && behind(n) == node && !done[ahead(n) as usize]);
            let Some(n) = next else {
                done[node as usize] = true;
                on_path.remove(&node);
                let Some(back) = path.pop() else { break };
                node = behind(back);
                continue;
            };
            path.push(n);
            node = ahead(n);
            if let Some(&from) = on_path.get(&node) {
                return Some(path.split_off(from));
            }
            on_path.insert(node, path.len());
        }
    }
    None
}

/// Open potentials of one part.
pub(super) struct Potentials {
    /// Island of each group; island 0 stands.
    pub(super) island: Vec<u32>,
    /// How far each island may fall and rise from the sample.
    pub(super) room: Vec<Interval>,
    /// Distances between islands: `apart[a][b]` is how much `a` may rise against `b`; only where few.
    apart: Vec<Vec<f64>>,
}

/// Islands and their room. `binds[n]` tells whether diode `n` fixes its voltage (it can carry current).
pub(super) fn potentials(part: &Passive, point: &Point, binds: &[bool]) -> Potentials {
    let mut sets = Sets::new(part.nodes);
    for r in &part.resistors {
        sets.union(r.p, r.q);
    }
    for (d, _) in part.diodes.iter().zip(binds).filter(|(_, binds)| **binds) {
        sets.union(d.p, d.q);
    }
    let mut number = vec![u32::MAX; part.nodes];
    let mut count = 0;
    let mut island = Vec::with_capacity(part.nodes);
    for n in 0..part.nodes as u32 {
        let root = sets.find(n) as usize;
        if number[root] == u32::MAX {
            number[root] = count;
            count += 1;
        }
        island.push(number[root]);
    }
    let count = count as usize;
    let bounds = if count > 1 { bounds(part, point, &island) } else { Vec::new() };
    let rise = nearest(count, &bounds, 0, false);
    let fall = nearest(count, &bounds, 0, true);
    let room = rise.iter().zip(&fall).map(|(&high, &low)| Interval { low: -low, high }).collect();
    let apart = match count {
        3..=200 => (0..count).map(|n| nearest(count, &bounds, n, false)).collect(),
        _ => Vec::new(),
    };
    Potentials { island, room, apart }
}

impl Potentials {
    /// How much the voltage from group `p` to group `q` may change from the sample.
    pub(super) fn between(&self, p: u32, q: u32) -> Interval {
        let (a, b) = (self.island[p as usize] as usize, self.island[q as usize] as usize);
        if a == b {
            return Interval { low: 0.0, high: 0.0 };
        }
        match self.apart.get(b) {
            Some(from_b) => Interval { low: -self.apart[a][b], high: from_b[a] },
            None => Interval {
                low: self.room[a].low - self.room[b].high,
                high: self.room[a].high - self.room[b].low,
            },
        }
    }
}

/// `shift(to) ≤ shift(from) + cost`.
type Bound = (u32, u32, f64);

fn bounds(part: &Passive, point: &Point, island: &[u32]) -> Vec<Bound> {
    let mut bounds = Vec::new();
    for d in &part.diodes {
        let (p, q) = (island[d.p as usize], island[d.q as usize]);
        if p == q {
            continue;
        }
        let v = part.across(d, &point.potentials).round();
        bounds.push((q, p, (d.forward - v).max(0.0)));
        if d.reverse.is_finite() {
            bounds.push((p, q, (v + d.reverse).max(0.0)));
        }
    }
    bounds
}

#[derive(PartialEq)]
struct Ordered(f64);
impl Eq for Ordered {}
impl PartialOrd for Ordered {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Ordered {
    fn cmp(&self, other: &Self) -> Ordering {
        self.0.total_cmp(&other.0)
    }
}

/// Shortest distances from island `start` (Dijkstra 1959), against the bounds' direction with `back`.
fn nearest(count: usize, bounds: &[Bound], start: usize, back: bool) -> Vec<f64> {
    let mut distance = vec![f64::INFINITY; count];
    distance[start] = 0.0;
    if bounds.is_empty() {
        return distance;
    }
    let ends = |b: &Bound| if back { (b.1, b.0) } else { (b.0, b.1) };
    let mut out = vec![Vec::new(); count];
    for (n, b) in bounds.iter().enumerate() {
        out[ends(b).0 as usize].push(n);
    }
    let mut heap = BinaryHeap::from([Reverse((Ordered(0.0), start))]);
    while let Some(Reverse((Ordered(d), node))) = heap.pop() {
        if d > distance[node] {
            continue;
        }
        for &n in &out[node] {
            let to = ends(&bounds[n]).1 as usize;
            let value = d + bounds[n].2;
            if value < distance[to] {
                distance[to] = value;
                heap.push(Reverse((Ordered(value), to)));
            }
        }
    }
    distance
}

/// Whether an interval of change is a point against the size of the voltages.
pub(super) fn is_point(room: Interval, size: f64) -> bool {
    room.high - room.low <= POINT * size
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_parallel_arcs_share_what_flows() {
        let junction = |current| Arc {
            from: 1,
            to: 0,
            current,
            rise: f64::INFINITY,
            fall: current,
            idle: false,
            short: false,
        };
        let ranges = current_ranges(2, &[junction(0.75), junction(0.25)]);
        for range in ranges {
            let range = range.unwrap();
            assert_eq!((range.low, range.high), (0.0, 1.0));
        }
    }

    #[test]
    fn a_bridge_is_not_open() {
        let arc = |from, to| Arc {
            from,
            to,
            current: 1.0,
            rise: f64::INFINITY,
            fall: 1.0,
            idle: false,
            short: false,
        };
        assert!(current_ranges(3, &[arc(0, 1), arc(1, 2)]).iter().all(Option::is_none));
    }
}
