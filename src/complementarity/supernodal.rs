//! Supernodal Cholesky of a conductance matrix (faer), for large systems of moderate spread. Answers `false`
//! where a pivot is not positive or a number not finite; the caller then takes `mesh`.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::cholesky as ch;
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Side};

/// Pattern, symbolic factor and numbers.
pub(super) struct Supernodal {
    n: usize,
    col_ptr: Vec<usize>,
    row_idx: Vec<usize>,
    /// Of each edge: entry of the first diagonal, of the second, of the off-diagonal.
    slots: Vec<[u32; 3]>,
    symbolic: ch::SymbolicCholesky<usize>,
    values: Vec<f64>,
    factor: Vec<f64>,
    memory: MemBuffer,
    solve_memory: MemBuffer,
    packed: Vec<f64>,
}

const NOWHERE: u32 = u32::MAX;

/// Entries of the factor at most: 2 GB of numbers.
const MOST_ENTRIES: usize = 250_000_000;

impl Supernodal {
    pub(super) fn new(nodes: usize, edges: &[(u32, u32)]) -> Option<Self> {
        let n = nodes - 1;
        let mut pairs: Vec<(u32, u32)> = (0..n as u32).map(|k| (k, k)).collect();
        let inner = edges.iter().filter(|(a, b)| a != b && *a != 0 && *b != 0);
        pairs.extend(inner.map(|&(a, b)| (a.min(b) - 1, a.max(b) - 1)));
        pairs.sort_unstable();
        pairs.dedup();
        let mut col_ptr = vec![0usize; n + 1];
        for (col, _) in &pairs {
            col_ptr[*col as usize + 1] += 1;
        }
        for k in 0..n {
            col_ptr[k + 1] += col_ptr[k];
        }
        let row_idx: Vec<usize> = pairs.iter().map(|(_, row)| *row as usize).collect();
        let slot = |a: u32, b: u32| pairs.binary_search(&(a.min(b), a.max(b))).map_or(NOWHERE, |s| s as u32);
        let slots = edges
            .iter()
            .map(|&(a, b)| match (a, b) {
                (a, b) if a == b => [NOWHERE; 3],
                (0, x) | (x, 0) => [slot(x - 1, x - 1), NOWHERE, NOWHERE],
                (a, b) => [slot(a - 1, a - 1), slot(b - 1, b - 1), slot(a - 1, b - 1)],
            })
            .collect();
        let pattern = SymbolicSparseColMatRef::new_checked(n, n, &col_ptr, None, &row_idx);
        let symbolic = ch::factorize_symbolic_cholesky(
            pattern,
            Side::Lower,
            ch::SymmetricOrdering::Amd,
            Default::default(),
        )
        .ok()?;
        if symbolic.len_val() > MOST_ENTRIES {
            return None;
        }
        let scratch = symbolic.factorize_numeric_llt_scratch::<f64>(Par::Seq, Default::default());
        let memory = MemBuffer::try_new(scratch).ok()?;
        let solve_memory = MemBuffer::try_new(symbolic.solve_in_place_scratch::<f64>(1, Par::Seq)).ok()?;
        Some(Supernodal {
            n,
            values: vec![0.0; row_idx.len()],
            factor: vec![0.0; symbolic.len_val()],
            packed: vec![0.0; n],
            col_ptr,
            row_idx,
            slots,
            symbolic,
            memory,
            solve_memory,
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
        let pattern =
            SymbolicSparseColMatRef::new_checked(self.n, self.n, &self.col_ptr, None, &self.row_idx);
        self.symbolic
            .factorize_numeric_llt(
                &mut self.factor,
                SparseColMatRef::new(pattern, &self.values),
                Side::Lower,
                Default::default(),
                Par::Seq,
                MemStack::new(&mut self.memory),
                Default::default(),
            )
            .is_ok()
            && self.factor.iter().all(|v| v.is_finite())
    }

    pub(super) fn solve(&mut self, values: &mut [f64]) {
        self.packed.copy_from_slice(&values[1..]);
        let factor = ch::LltRef::new(&self.symbolic, &self.factor);
        factor.solve_in_place_with_conj(
            Conj::No,
            MatMut::from_column_major_slice_mut(&mut self.packed, self.n, 1),
            Par::Seq,
            MemStack::new(&mut self.solve_memory),
        );
        values[0] = 0.0;
        values[1..].copy_from_slice(&self.packed);
    }
}
