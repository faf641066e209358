//! Elimination of nodes by the star–mesh transformation (Rosen 1924): only sums, products and quotients of
//! positive numbers, so every conductance keeps its relative accuracy however wide the values are spread. As a
//! matrix method it is LDLᵀ with the diagonal summed anew instead of subtracted (Alfa, Xue & Ye 2002).

use super::ordering::elimination_order;

/// Pattern and numbers of the factor. Unknowns are numbered in elimination order.
pub(super) struct Mesh {
    /// Position in the order of each node (node 0: unused).
    position: Vec<u32>,
    /// Where each edge adds its conductance: entry of `conductance`, or `ground + position`, or nowhere.
    slot: Vec<u32>,
    start: Vec<u32>,
    row: Vec<u32>,
    conductance: Vec<f64>,
    ground: Vec<f64>,
    total: Vec<f64>,
}

const NOWHERE: u32 = u32::MAX;

impl Mesh {
    pub(super) fn new(nodes: usize, edges: &[(u32, u32)]) -> Self {
        let (order, columns) =
            if nodes <= 65 { small_columns(nodes, edges) } else { large_columns(nodes, edges) };
        let mut position = vec![0u32; nodes];
        for (k, &node) in order.iter().enumerate() {
            position[node as usize] = k as u32;
        }
        let mut start = Vec::with_capacity(nodes);
        let mut row = Vec::new();
        for column in columns {
            start.push(row.len() as u32);
            row.extend(column);
        }
        start.push(row.len() as u32);
        let n = nodes - 1;
        let mut mesh = Mesh {
            position,
            slot: Vec::new(),
            conductance: vec![0.0; row.len()],
            start,
            row,
            ground: vec![0.0; n],
            total: vec![0.0; n],
        };
        mesh.slot = edges.iter().map(|&(a, b)| mesh.find_slot(a, b)).collect();
        mesh
    }

    fn find_slot(&self, a: u32, b: u32) -> u32 {
        if a == b {
            return NOWHERE;
        }
        if a == 0 || b == 0 {
            return self.row.len() as u32 + self.position[a.max(b) as usize];
        }
        let (p, q) = (self.position[a as usize], self.position[b as usize]);
        let (column, wanted) = (p.min(q) as usize, p.max(q));
        let (from, to) = (self.start[column] as usize, self.start[column + 1] as usize);
        match self.row[from..to].binary_search(&wanted) {
            Ok(at) => (from + at) as u32,
            Err(_) => NOWHERE,
        }
    }

    pub(super) fn factor(&mut self, conductances: &[f64]) {
        let n = self.ground.len();
        let entries = self.row.len();
        self.conductance.fill(0.0);
        self.ground.fill(0.0);
        for (&slot, &g) in self.slot.iter().zip(conductances) {
            let slot = slot as usize;
            if slot < entries {
                self.conductance[slot] += g;
            } else if slot < entries + n {
                self.ground[slot - entries] += g;
            }
        }
        let mut work = vec![0.0; n];
        // columns whose next row is i, as a linked list
        let mut first = vec![NOWHERE; n];
        let mut next = vec![NOWHERE; n];
        let mut at: Vec<u32> = self.start[..n].to_vec();
        for i in 0..n {
            let mut k = first[i];
            while k != NOWHERE {
                let following = next[k as usize];
                self.spread(k as usize, &mut at, i, &mut work);
                self.enlist(k as usize, &at, &mut first, &mut next);
                k = following;
            }
            let mut total = self.ground[i];
            for e in self.start[i] as usize..self.start[i + 1] as usize {
                let r = self.row[e] as usize;
                self.conductance[e] += work[r];
                work[r] = 0.0;
                total += self.conductance[e];
            }
            self.total[i] = total;
            self.enlist(i, &at, &mut first, &mut next);
        }
    }

    /// The mesh edges at `i` that the elimination of `k` leaves behind.
    fn spread(&mut self, k: usize, at: &mut [u32], i: usize, work: &mut [f64]) {
        let from = at[k] as usize;
        let share = self.conductance[from] / self.total[k];
        self.ground[i] += share * self.ground[k];
        let to = self.start[k + 1] as usize;
        for (r, c) in self.row[from + 1..to].iter().zip(&self.conductance[from + 1..to]) {
            work[*r as usize] += share * c;
        }
        at[k] += 1;
    }

    fn enlist(&self, k: usize, at: &[u32], first: &mut [u32], next: &mut [u32]) {
        if at[k] < self.start[k + 1] {
            let row = self.row[at[k] as usize] as usize;
            next[k] = first[row];
            first[row] = k as u32;
        }
    }

    pub(super) fn solve(&self, values: &mut [f64]) {
        let n = self.ground.len();
        let mut x = vec![0.0; n];
        for (node, &k) in self.position.iter().enumerate().skip(1) {
            x[k as usize] = values[node];
        }
        for k in 0..n {
            let flow = x[k] / self.total[k];
            for e in self.start[k] as usize..self.start[k + 1] as usize {
                x[self.row[e] as usize] += flow * self.conductance[e];
            }
        }
        for k in (0..n).rev() {
            let mut sum = x[k];
            for e in self.start[k] as usize..self.start[k + 1] as usize {
                sum += self.conductance[e] * x[self.row[e] as usize];
            }
            x[k] = sum / self.total[k];
        }
        values[0] = 0.0;
        for (node, &k) in self.position.iter().enumerate().skip(1) {
            values[node] = x[k as usize];
        }
    }
}

/// Order by minimum degree and columns of the factor, on sets of bits (at most 64 unknowns).
fn small_columns(nodes: usize, edges: &[(u32, u32)]) -> (Vec<u32>, Vec<Vec<u32>>) {
    let n = nodes - 1;
    let mut near = [0u64; 64];
    for &(a, b) in edges.iter().filter(|(a, b)| a != b && *a != 0 && *b != 0) {
        near[a as usize - 1] |= 1 << (b - 1);
        near[b as usize - 1] |= 1 << (a - 1);
    }
    let mut order = Vec::with_capacity(n);
    let mut sets = Vec::with_capacity(n);
    let mut left: u64 = if n == 64 { u64::MAX } else { (1 << n) - 1 };
    while left != 0 {
        let k = bits(left).min_by_key(|&v| near[v].count_ones()).unwrap_or(0);
        left &= !(1 << k);
        let set = near[k];
        for v in bits(set) {
            near[v] = (near[v] | set) & !(1 << v) & !(1 << k);
        }
        order.push(k as u32 + 1);
        sets.push(set);
    }
    let mut position = [0u32; 64];
    for (k, &node) in order.iter().enumerate() {
        position[node as usize - 1] = k as u32;
    }
    let columns = sets.into_iter().map(|set| {
        let mut rows: Vec<u32> = bits(set).map(|v| position[v]).collect();
        rows.sort_unstable();
        rows
    });
    (order, columns.collect())
}

fn bits(mut set: u64) -> impl Iterator<Item = usize> {
    std::iter::from_fn(move || {
        if set == 0 {
            return None;
        }
        let bit = set.trailing_zeros() as usize;
        set &= set - 1;
        Some(bit)
    })
}

/// The same for any size: a column is its own entries and those of its children in the elimination tree.
fn large_columns(nodes: usize, edges: &[(u32, u32)]) -> (Vec<u32>, Vec<Vec<u32>>) {
    let n = nodes - 1;
    let order = elimination_order(nodes, edges);
    let mut position = vec![0u32; nodes];
    for (k, &node) in order.iter().enumerate() {
        position[node as usize] = k as u32;
    }
    let mut columns: Vec<Vec<u32>> = vec![Vec::new(); n];
    for &(a, b) in edges.iter().filter(|(a, b)| a != b && *a != 0 && *b != 0) {
        let (p, q) = (position[a as usize], position[b as usize]);
        columns[p.min(q) as usize].push(p.max(q));
    }
    for k in 0..n {
        let mut column = std::mem::take(&mut columns[k]);
        column.sort_unstable();
        column.dedup();
        if let [parent, above @ ..] = &column[..] {
            columns[*parent as usize].extend_from_slice(above);
        }
        columns[k] = column;
    }
    (order, columns)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_chain_across_fifteen_decades_keeps_every_digit() {
        // 1 mΩ, 1 mΩ, 1 TΩ to ground, 1 A in at the far end: by hand 1e12, 1e12 + 1e-3, 1e12 + 2e-3 V; the drops
        // along the milliohms are lost in the potentials but the ground current is not
        let edges = [(1, 2), (2, 3), (3, 0)];
        let mut mesh = Mesh::new(4, &edges);
        mesh.factor(&[1e3, 1e3, 1e-12]);
        let mut x = [0.0, 1.0, 0.0, 0.0];
        mesh.solve(&mut x);
        assert!((x[3] - 1e12).abs() <= 1e-3, "{x:?}");
    }

    #[test]
    fn small_and_large_patterns_agree() {
        let nodes = 60;
        let edges: Vec<(u32, u32)> = (0..240u32)
            .map(|k| (k * 7 % 60, (k * k + 3 * k + 1) % 60))
            .chain((1..60).map(|k| (k - 1, k)))
            .collect();
        let g: Vec<f64> = (0..edges.len()).map(|k| 1.0 + (k % 13) as f64).collect();
        let mut solutions = Vec::new();
        for (order, columns) in [small_columns(nodes, &edges), large_columns(nodes, &edges)] {
            assert_eq!(order.len(), columns.len());
            let mut mesh = Mesh::new(nodes, &edges);
            mesh.factor(&g);
            let mut x: Vec<f64> = (0..nodes).map(|k| (k % 5) as f64 - 2.0).collect();
            mesh.solve(&mut x);
            solutions.push(x);
        }
        let x = &solutions[0];
        let mut residual: Vec<f64> = (0..nodes).map(|k| (k % 5) as f64 - 2.0).collect();
        for (&(a, b), g) in edges.iter().zip(&g) {
            let i = g * (x[a as usize] - x[b as usize]);
            residual[a as usize] -= i;
            residual[b as usize] += i;
        }
        assert!(residual[1..].iter().all(|r| r.abs() < 1e-12), "{residual:?}");
    }
}
