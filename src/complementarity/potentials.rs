//! Open potentials of one part, as feasible intervals: islands that only blocking junctions tie to the rest, and how
//! far each may move before one of those would carry current. Currents are `openness`'s.

use super::forest::Sets;
use super::openness::POINT;
use super::outcome::Interval;
use super::passive::{Passive, Point};
use std::cmp::{Ordering, Reverse};
use std::collections::BinaryHeap;

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
