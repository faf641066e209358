//! Current that merely circulates through arcs without voltage (ideal diodes, sources of 0 V, shorts) is no answer:
//! it is taken out of the sample, and no range of a current counts it.

use super::flow::Flow;
use super::forest::Sets;
use super::openness::{Arc, POINT};

/// Nodes joined by arcs without voltage, up to which every order of them is tried.
const FEW: usize = 9;

/// The arcs without voltage of a block, its nodes numbered anew.
pub(super) struct Idle {
    /// One for each arc of the block; only those without voltage count.
    arcs: Vec<Local>,
    nodes: usize,
    /// Set of each node: those that arcs without voltage join.
    joined: Vec<u32>,
}

#[derive(Clone, Copy)]
struct Local {
    from: u32,
    to: u32,
    idle: bool,
    /// Passes current either way: a source of 0 V or a short, rather than a diode.
    both: bool,
    current: f64,
}

impl Idle {
    pub(super) fn new(arcs: &[Arc], block: &[u32], names: &[u32]) -> Self {
        let local = |node: u32| names.binary_search(&node).unwrap_or(0) as u32;
        let arcs: Vec<Local> = block
            .iter()
            .map(|&n| &arcs[n as usize])
            .map(|arc| Local {
                from: local(arc.from),
                to: local(arc.to),
                idle: arc.idle,
                both: arc.fall == f64::INFINITY,
                current: arc.current,
            })
            .collect();
        let mut sets = Sets::new(names.len());
        for arc in arcs.iter().filter(|arc| arc.idle) {
            sets.union(arc.from, arc.to);
        }
        let joined = (0..names.len() as u32).map(|n| sets.find(n)).collect();
        Idle { arcs, nodes: names.len(), joined }
    }

    /// How much more an arc without voltage can carry if that returns from `from` to `to`. As long as it only undoes
    /// the `against` that runs the other way, nothing circulates; beyond that, other such arcs may not carry it back.
    pub(super) fn greatest(&self, flow: &mut Flow, from: u32, to: u32, against: f64) -> f64 {
        let mut undone = 0.0;
        if against > 0.0 {
            undone = flow.at_most(from, to, against);
            if undone < against {
                return undone;
            }
        }
        let set = self.joined[from as usize];
        let others: Vec<u32> = (0..self.nodes as u32)
            .filter(|&n| self.joined[n as usize] == set && n != from && n != to)
            .collect();
        let whole = flow.snapshot();
        let mut most = 0.0f64;
        if others.len() + 2 <= FEW {
            for choice in 0..1u32 << others.len() {
                let mut behind = vec![false; self.nodes];
                behind[from as usize] = true;
                for (bit, &node) in others.iter().enumerate() {
                    behind[node as usize] = choice >> bit & 1 == 1;
                }
                flow.restore(&whole);
                if self.part(flow, &behind, set) {
                    most = most.max(flow.greatest(from, to));
                }
            }
            return undone + most;
        }
        // too many orders of nodes: what is certainly possible with the set cut at either end
        for last in [true, false] {
            let behind: Vec<bool> =
                (0..self.nodes as u32).map(|n| if last { n != to } else { n == from }).collect();
            flow.restore(&whole);
            if self.part(flow, &behind, set) {
                most = most.max(flow.greatest(from, to));
            }
        }
        undone + most
    }

    /// A flow has no circle through an arc from `to` to `from` exactly if the nodes can be parted into those before it and those
    /// `behind` it so that no arc without voltage carries current back. Sends what runs back another way and closes
    /// those ways; `false` where some of it has no other.
    fn part(&self, flow: &mut Flow, behind: &[bool], set: u32) -> bool {
        for (k, arc) in self.arcs.iter().enumerate() {
            let number = 2 * k as u32;
            if !arc.idle || self.joined[arc.from as usize] != set || flow.closed(number) {
                continue;
            }
            let (back, sign) = match (behind[arc.from as usize], behind[arc.to as usize]) {
                (true, false) => (number, 1.0),
                (false, true) => (number + 1, -1.0),
                _ => continue,
            };
            let carried = sign * (arc.current + flow.moved(number));
            if carried > 0.0 {
                let (from, to) = if sign > 0.0 { (arc.from, arc.to) } else { (arc.to, arc.from) };
                flow.close(number);
                if flow.at_most(from, to, carried) < carried * (1.0 - POINT) {
                    return false;
                }
                flow.open(back ^ 1, if arc.both { f64::INFINITY } else { 0.0 });
            } else {
                // what runs the right way may be undone, no more
                flow.limit(back, -carried);
            }
        }
        true
    }
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
