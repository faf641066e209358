//! Which edges meet at each node of a graph that is given as pairs of nodes: one flat list, made by counting, since a list
//! for each node takes several times the memory. What the edges are is not known here.

/// Neighbours and edge numbers by node, both directions.
pub(super) struct Adjacent {
    starts: Vec<u32>,
    pairs: Vec<(u32, u32)>,
}

impl Adjacent {
    /// Of edges by their ends, numbered in their order.
    pub fn of(nodes: usize, edges: impl Iterator<Item = (u32, u32)> + Clone) -> Self {
        let mut starts = vec![0u32; nodes + 1];
        for (a, b) in edges.clone() {
            starts[a as usize] += 1;
            starts[b as usize] += 1;
        }
        let mut sum = 0;
        for start in &mut starts {
            sum += *start;
            *start = sum;
        }
        // filled from behind, so that the ends of the lists become their starts
        let mut pairs = vec![(0, 0); sum as usize];
        for (number, (a, b)) in (0u32..).zip(edges) {
            for (from, to) in [(a, b), (b, a)] {
                let at = &mut starts[from as usize];
                *at -= 1;
                pairs[*at as usize] = (to, number);
            }
        }
        let mut adjacent = Adjacent { starts, pairs };
        for node in 0..nodes {
            let range = adjacent.range(node);
            adjacent.pairs[range].reverse();
        }
        adjacent
    }

    fn range(&self, node: usize) -> std::ops::Range<usize> {
        self.starts[node] as usize..self.starts[node + 1] as usize
    }

    /// The other end and the number of every edge at a node, in their order.
    pub fn of_node(&self, node: usize) -> &[(u32, u32)] {
        &self.pairs[self.range(node)]
    }
}
