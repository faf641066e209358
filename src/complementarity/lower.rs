//! A symmetric sparse matrix by its lower triangle, ordered once and factored often (faer), as LLᵀ or LDLᵀ. Which
//! numbers it holds, and whether a factor is any good, is for those to say who fill it.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::cholesky as ch;
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Side};

/// The place of an entry that is not there.
pub(super) const NOWHERE: u32 = u32::MAX;

/// What the matrix is factored into.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    /// LLᵀ: positive definite.
    Positive,
    /// LDLᵀ: as many negative pivots as it likes.
    Signed,
}

/// Pattern, order and room to work in.
pub(super) struct Lower {
    kind: Kind,
    n: usize,
    col_ptr: Vec<usize>,
    row_idx: Vec<usize>,
    symbolic: ch::SymbolicCholesky<usize>,
    memory: MemBuffer,
    solve_memory: MemBuffer,
}

impl Lower {
    /// Of `n` rows, with the diagonal and the entries at `pairs` of column and row, the row not above the column, in any
    /// order and repeated as they come. `None` where its factor would hold more than `most` numbers, or no room is left.
    pub fn new(kind: Kind, n: usize, pairs: impl Iterator<Item = (u32, u32)>, most: usize) -> Option<Self> {
        let mut all: Vec<(u32, u32)> = (0..n as u32).map(|k| (k, k)).chain(pairs).collect();
        all.sort_unstable();
        all.dedup();
        let mut col_ptr = vec![0usize; n + 1];
        for (col, _) in &all {
            col_ptr[*col as usize + 1] += 1;
        }
        for k in 0..n {
            col_ptr[k + 1] += col_ptr[k];
        }
        let row_idx: Vec<usize> = all.iter().map(|(_, row)| *row as usize).collect();
        let pattern = SymbolicSparseColMatRef::new_checked(n, n, &col_ptr, None, &row_idx);
        let order = ch::SymmetricOrdering::Amd;
        let symbolic =
            ch::factorize_symbolic_cholesky(pattern, Side::Lower, order, Default::default()).ok()?;
        if symbolic.len_val() > most {
            return None;
        }
        let scratch = match kind {
            Kind::Positive => symbolic.factorize_numeric_llt_scratch::<f64>(Par::Seq, Default::default()),
            Kind::Signed => symbolic.factorize_numeric_ldlt_scratch::<f64>(Par::Seq, Default::default()),
        };
        let memory = MemBuffer::try_new(scratch).ok()?;
        let solve_memory = MemBuffer::try_new(symbolic.solve_in_place_scratch::<f64>(1, Par::Seq)).ok()?;
        Some(Lower { kind, n, col_ptr, row_idx, symbolic, memory, solve_memory })
    }

    /// Entries of the matrix.
    pub fn entries(&self) -> usize {
        self.row_idx.len()
    }

    /// Numbers of a factor.
    pub fn factor_length(&self) -> usize {
        self.symbolic.len_val()
    }

    /// Where the numbers of an entry stand.
    pub fn place(&self, col: u32, row: u32) -> u32 {
        let Some(&[from, to]) = self.col_ptr.get(col as usize..col as usize + 2) else { return NOWHERE };
        let rows = &self.row_idx[from..to];
        rows.binary_search(&(row as usize)).map_or(NOWHERE, |at| (from + at) as u32)
    }

    /// Factors the matrix of these numbers. `false` where a pivot rules that out.
    pub fn factor(&mut self, values: &[f64], numbers: &mut [f64]) -> bool {
        let Lower { kind, n, col_ptr, row_idx, symbolic, memory, .. } = self;
        let pattern = SymbolicSparseColMatRef::new_checked(*n, *n, col_ptr, None, row_idx);
        let (matrix, stack) = (SparseColMatRef::new(pattern, values), MemStack::new(memory));
        let (side, par) = (Side::Lower, Par::Seq);
        match kind {
            Kind::Positive => symbolic
                .factorize_numeric_llt(
                    numbers,
                    matrix,
                    side,
                    Default::default(),
                    par,
                    stack,
                    Default::default(),
                )
                .is_ok(),
            Kind::Signed => symbolic
                .factorize_numeric_ldlt(
                    numbers,
                    matrix,
                    side,
                    Default::default(),
                    par,
                    stack,
                    Default::default(),
                )
                .is_ok(),
        }
    }

    /// Solves with a factor, in place.
    pub fn solve(&mut self, numbers: &[f64], right: &mut [f64]) {
        let stack = MemStack::new(&mut self.solve_memory);
        let right = MatMut::from_column_major_slice_mut(right, self.n, 1);
        match self.kind {
            Kind::Positive => ch::LltRef::new(&self.symbolic, numbers).solve_in_place_with_conj(
                Conj::No,
                right,
                Par::Seq,
                stack,
            ),
            Kind::Signed => ch::LdltRef::new(&self.symbolic, numbers).solve_in_place_with_conj(
                Conj::No,
                right,
                Par::Seq,
                stack,
            ),
        }
    }

    /// `right − matrix·values`.
    pub fn miss(&self, entries: &[f64], right: &[f64], values: &[f64], out: &mut [f64]) {
        out.copy_from_slice(right);
        for col in 0..self.n {
            let range = self.col_ptr[col]..self.col_ptr[col + 1];
            for (&row, entry) in self.row_idx[range.clone()].iter().zip(&entries[range]) {
                out[row] -= entry * values[col];
                if row != col {
                    out[col] -= entry * values[row];
                }
            }
        }
    }
}
