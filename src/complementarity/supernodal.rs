//! Supernodal Cholesky of a conductance matrix, for large systems of moderate spread. Answers `false`
//! where a pivot is not positive or a number not finite; the caller then takes `mesh`.

use super::lower::{Kind, Lower, NOWHERE};

/// Pattern, symbolic factor and numbers.
pub(super) struct Supernodal {
    matrix: Lower,
    /// Of each edge: entry of the first diagonal, of the second, of the off-diagonal.
    slots: Vec<[u32; 3]>,
    values: Vec<f64>,
    factor: Vec<f64>,
    packed: Vec<f64>,
}

/// Entries of the factor at most: 2 GB of numbers.
const MOST_ENTRIES: usize = 250_000_000;

impl Supernodal {
    pub(super) fn new(nodes: usize, edges: &[(u32, u32)]) -> Option<Self> {
        let n = nodes - 1;
        let inner = edges.iter().filter(|(a, b)| a != b && *a != 0 && *b != 0);
        let pairs = inner.map(|&(a, b)| (a.min(b) - 1, a.max(b) - 1));
        let matrix = Lower::new(Kind::Positive, n, pairs, MOST_ENTRIES)?;
        let slot = |a: u32, b: u32| matrix.place(a.min(b), a.max(b));
        let slots = edges
            .iter()
            .map(|&(a, b)| match (a, b) {
                (a, b) if a == b => [NOWHERE; 3],
                (0, x) | (x, 0) => [slot(x - 1, x - 1), NOWHERE, NOWHERE],
                (a, b) => [slot(a - 1, a - 1), slot(b - 1, b - 1), slot(a - 1, b - 1)],
            })
            .collect();
        Some(Supernodal {
            values: vec![0.0; matrix.entries()],
            factor: vec![0.0; matrix.factor_length()],
            packed: vec![0.0; n],
            matrix,
            slots,
        })
    }

    pub(super) fn factor(&mut self, edges: &[(u32, u32)], conductances: &[f64]) -> bool {
        self.values.fill(0.0);
        debug_assert_eq!(edges.len(), self.slots.len());
        for ([a, b, across], &g) in self.slots.iter().zip(conductances) {
            for (slot, value) in [(a, g), (b, g), (across, -g)] {
                if let Some(entry) = self.values.get_mut(*slot as usize) {
                    *entry += value;
                }
            }
        }
        self.matrix.factor(&self.values, &mut self.factor) && self.factor.iter().all(|v| v.is_finite())
    }

    pub(super) fn solve(&mut self, values: &mut [f64]) {
        self.packed.copy_from_slice(&values[1..]);
        self.matrix.solve(&self.factor, &mut self.packed);
        values[0] = 0.0;
        values[1..].copy_from_slice(&self.packed);
    }
}
