//! What the laws leave open in currents, as feasible intervals: currents that can shift around loops of branches
//! whose voltages stand whatever they carry. What merely circulates is `idle`'s, open potentials are `potentials`'s.

use super::flow::Flow;
use super::forest::{Adjacency, Sets};
use super::idle::Idle;
use super::outcome::Interval;

/// Share of the largest current or voltage below which an interval is a point.
pub(super) const POINT: f64 = 1e-11;
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
    let whole = flow.snapshot();
    let idle = Idle::new(arcs, block, &names);
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
