//! Greatest flow through a small network by blocking flows (Dinic 1970). Capacities may be infinite; so may the
//! answer.

/// Arcs in pairs: arc `k` and its companion `k ^ 1`, which goes back.
#[derive(Debug, Clone)]
pub(super) struct Flow {
    to: Vec<u32>,
    capacity: Vec<f64>,
    /// What has been sent along each arc; its companion holds the opposite.
    moved: Vec<f64>,
    out: Vec<Vec<u32>>,
    /// Capacity that counts as none.
    nothing: f64,
}

/// Capacities and what has been sent, to come back to.
pub(super) struct Snapshot {
    capacity: Vec<f64>,
    moved: Vec<f64>,
}

impl Flow {
    pub(super) fn new(nodes: usize, nothing: f64) -> Self {
        Flow {
            to: Vec::new(),
            capacity: Vec::new(),
            moved: Vec::new(),
            out: vec![Vec::new(); nodes],
            nothing,
        }
    }

    /// Adds an arc with a capacity each way; returns its number.
    pub(super) fn add(&mut self, from: u32, to: u32, there: f64, back: f64) -> u32 {
        let number = self.to.len() as u32;
        self.to.extend([to, from]);
        self.capacity.extend([there, back]);
        self.moved.extend([0.0, 0.0]);
        self.out[from as usize].push(number);
        self.out[to as usize].push(number + 1);
        number
    }

    pub(super) fn snapshot(&self) -> Snapshot {
        Snapshot { capacity: self.capacity.clone(), moved: self.moved.clone() }
    }

    pub(super) fn restore(&mut self, snapshot: &Snapshot) {
        self.capacity.copy_from_slice(&snapshot.capacity);
        self.moved.copy_from_slice(&snapshot.moved);
    }

    /// Closes an arc both ways.
    pub(super) fn close(&mut self, arc: u32) {
        self.capacity[arc as usize] = 0.0;
        self.capacity[arc as usize ^ 1] = 0.0;
    }

    /// Whether nothing can pass an arc either way.
    pub(super) fn closed(&self, arc: u32) -> bool {
        self.capacity[arc as usize] == 0.0 && self.capacity[arc as usize ^ 1] == 0.0
    }

    /// Sets what an arc can still pass.
    pub(super) fn open(&mut self, arc: u32, capacity: f64) {
        self.capacity[arc as usize] = capacity;
    }

    /// What has been sent along an arc, less what was sent back.
    pub(super) fn moved(&self, arc: u32) -> f64 {
        self.moved[arc as usize]
    }

    /// Limits the way there of an arc.
    pub(super) fn limit(&mut self, arc: u32, capacity: f64) {
        self.capacity[arc as usize] = self.capacity[arc as usize].min(capacity);
    }

    /// Greatest flow from `source` to `sink`; capacities become those that are left.
    pub(super) fn greatest(&mut self, source: u32, sink: u32) -> f64 {
        let mut total = 0.0;
        loop {
            let level = self.levels(source);
            if level[sink as usize] == u32::MAX || source == sink {
                return total;
            }
            let mut next = vec![0usize; self.out.len()];
            loop {
                let pushed = self.push(source, sink, &level, &mut next);
                if pushed == f64::INFINITY {
                    return f64::INFINITY;
                }
                if pushed <= 0.0 {
                    break;
                }
                total += pushed;
            }
        }
    }

    /// The same, but no more than `most`.
    pub(super) fn at_most(&mut self, source: u32, sink: u32, most: f64) -> f64 {
        self.out.push(Vec::new());
        let gate = self.out.len() as u32 - 1;
        let arc = self.add(gate, source, most, 0.0);
        let sent = self.greatest(gate, sink);
        self.out.pop();
        self.out[source as usize].pop();
        self.to.truncate(arc as usize);
        self.capacity.truncate(arc as usize);
        self.moved.truncate(arc as usize);
        sent
    }

    /// Nodes that flow could still reach from `source`.
    pub(super) fn reachable(&self, source: u32) -> Vec<bool> {
        self.levels(source).into_iter().map(|l| l != u32::MAX).collect()
    }

    fn levels(&self, source: u32) -> Vec<u32> {
        let mut level = vec![u32::MAX; self.out.len()];
        let mut queue = std::collections::VecDeque::from([source]);
        level[source as usize] = 0;
        while let Some(node) = queue.pop_front() {
            for &arc in &self.out[node as usize] {
                let to = self.to[arc as usize] as usize;
                if self.capacity[arc as usize] > self.nothing && level[to] == u32::MAX {
                    level[to] = level[node as usize] + 1;
                    queue.push_back(to as u32);
                }
            }
        }
        level
    }

    /// One path of the level graph, found without recursion.
    fn push(&mut self, source: u32, sink: u32, level: &[u32], next: &mut [usize]) -> f64 {
        let mut path: Vec<u32> = Vec::new();
        let mut node = source;
        while node != sink {
            let out = &self.out[node as usize];
            let step = out[next[node as usize].min(out.len())..].iter().position(|&arc| {
                let to = self.to[arc as usize] as usize;
                self.capacity[arc as usize] > self.nothing && level[to] == level[node as usize] + 1
            });
            match step {
                Some(skip) => {
                    next[node as usize] += skip;
                    let arc = out[next[node as usize]];
                    path.push(arc);
                    node = self.to[arc as usize];
                }
                None => {
                    next[node as usize] = out.len();
                    let Some(arc) = path.pop() else { return 0.0 };
                    node = self.to[arc as usize ^ 1];
                    next[node as usize] += 1;
                }
            }
        }
        let most = path.iter().map(|&arc| self.capacity[arc as usize]).fold(f64::INFINITY, f64::min);
        if most.is_finite() {
            for arc in path {
                self.capacity[arc as usize] -= most;
                self.capacity[arc as usize ^ 1] += most;
                self.moved[arc as usize] += most;
                self.moved[arc as usize ^ 1] -= most;
            }
        }
        most
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_narrowest_cut_limits() {
        let mut flow = Flow::new(4, 0.0);
        flow.add(0, 1, 3.0, 0.0);
        flow.add(0, 2, 2.0, 0.0);
        flow.add(1, 3, 2.0, 0.0);
        flow.add(2, 3, 5.0, 0.0);
        flow.add(1, 2, 10.0, 0.0);
        assert_eq!(flow.greatest(0, 3), 5.0);
        assert_eq!(flow.reachable(0), [true, false, false, false]);
    }

    #[test]
    fn without_a_limit_it_is_infinite() {
        let mut flow = Flow::new(2, 0.0);
        flow.add(0, 1, f64::INFINITY, 0.0);
        assert_eq!(flow.greatest(0, 1), f64::INFINITY);
    }
}
