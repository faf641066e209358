//! Square linear systems without structure, solved after scaling: dense elimination with full pivoting where they are
//! small, sparse LU (faer) with refinement where they are not. `None` without full rank; what a system means is not
//! known here.

use super::double_double::Dd;
use super::equations::Entry;
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::lu;
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par};
use nalgebra::{DMatrix, Dyn, FullPivLU};

/// Ratio of pivots below which a system has no full rank, and its inverse the greatest growth of a sparse solution.
const RANK: f64 = 1e-11;
/// Unknowns up to which elimination is dense.
const DENSE: usize = 200;
/// Ratio of pivots where the rank is known: what is smaller is rounding of what is larger.
const SPREAD: f64 = 1e-18;
/// Steps of refinement with residuals of twice the digits at most: each adds as many digits as the condition leaves.
const MOST_STEPS: usize = 12;
/// Share of the largest unknown by which a last step may move.
const SETTLED: f64 = 1e-24;

/// Solves for every column of `right`.
pub(super) fn solve(size: usize, entries: &[Entry], right: DMatrix<f64>) -> Option<DMatrix<f64>> {
    let factor = Factor::new(size, entries)?;
    let mut x = right.clone();
    if !factor.apply(&mut x) {
        return None;
    }
    let mut correction = right;
    for k in 0..correction.ncols() {
        for &(r, c, v) in entries {
            correction[(r, k)] -= v * x[(c, k)];
        }
    }
    if !factor.apply(&mut correction) {
        return None;
    }
    x += correction;
    x.iter().all(|v| v.is_finite()).then_some(x)
}

/// Solves for one right side with twice the digits.
pub(super) fn refined(size: usize, entries: &[Entry], right: &[Dd]) -> Option<Vec<Dd>> {
    refine(&Factor::new(size, entries)?, size, entries, right)
}

/// The same where that the system has full rank is known already: its pivots may then be as far apart as its numbers
/// are, and that the refinement settles is asked for instead.
pub(super) fn refined_of_full_rank(size: usize, entries: &[Entry], right: &[Dd]) -> Option<Vec<Dd>> {
    refine(&Factor::with_pivots(size, entries, SPREAD)?, size, entries, right)
}

fn refine(factor: &Factor, size: usize, entries: &[Entry], right: &[Dd]) -> Option<Vec<Dd>> {
    let mut x = vec![Dd::ZERO; size];
    for _ in 0..MOST_STEPS {
        let mut miss: Vec<Dd> = right.to_vec();
        for &(r, c, v) in entries {
            miss[r] += -x[c].times(v);
        }
        let mut change = DMatrix::from_iterator(size, 1, miss.into_iter().map(Dd::round));
        if !factor.apply(&mut change) {
            return None;
        }
        x.iter_mut().zip(change.iter()).for_each(|(x, &by)| *x += by.into());
        if !x.iter().all(|v| v.round().is_finite()) {
            return None;
        }
        let scaled = |of: f64, (most, column): (f64, &f64)| most.max((of / column).abs());
        let moved = change.iter().zip(&factor.columns).fold(0.0, |most, (&by, c)| scaled(by, (most, c)));
        let whole = x.iter().zip(&factor.columns).fold(0.0, |most, (v, c)| scaled(v.round(), (most, c)));
        if moved <= SETTLED * whole {
            return Some(x);
        }
    }
    None
}

/// Solves a square system after scaling rows and columns; `None` without full rank.
pub(super) fn solved(matrix: &DMatrix<f64>, right: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let entries: Vec<Entry> = (0..matrix.ncols())
        .flat_map(|c| (0..matrix.nrows()).map(move |r| (r, c)))
        .map(|(r, c)| (r, c, matrix[(r, c)]))
        .filter(|(.., v)| *v != 0.0)
        .collect();
    solve(matrix.nrows(), &entries, right.clone())
}

/// The entries as a matrix.
pub(super) fn dense(size: usize, entries: &[Entry]) -> DMatrix<f64> {
    let mut matrix = DMatrix::zeros(size, size);
    for &(row, column, value) in entries {
        matrix[(row, column)] += value;
    }
    matrix
}

/// Factors of a matrix scaled so that the largest number of each row and column is near 1.
struct Factor {
    rows: Vec<f64>,
    columns: Vec<f64>,
    kind: Kind,
}

enum Kind {
    Empty,
    Dense(Box<FullPivLU<f64, Dyn, Dyn>>),
    Sparse(Box<(lu::SymbolicLu<usize>, lu::NumericLu<usize, f64>)>),
}

impl Factor {
    fn new(size: usize, entries: &[Entry]) -> Option<Self> {
        Self::with_pivots(size, entries, RANK)
    }

    /// `None` where pivots are further apart than `spread`.
    fn with_pivots(size: usize, entries: &[Entry], spread: f64) -> Option<Self> {
        let mut entries = summed(entries);
        let mut rows = vec![0.0f64; size];
        entries.iter().for_each(|&(r, _, v)| rows[r] = rows[r].max(v.abs()));
        let rows: Vec<f64> = rows.into_iter().map(inverse).collect();
        entries.iter_mut().for_each(|(r, _, v)| *v *= rows[*r]);
        let mut columns = vec![0.0f64; size];
        entries.iter().for_each(|&(_, c, v)| columns[c] = columns[c].max(v.abs()));
        let columns: Vec<f64> = columns.into_iter().map(inverse).collect();
        entries.iter_mut().for_each(|(_, c, v)| *v *= columns[*c]);
        let kind = match size {
            0 => Kind::Empty,
            1..=DENSE => {
                let lu = dense(size, &entries).full_piv_lu();
                let pivots = lu.u().diagonal().abs();
                (pivots.min() > spread * pivots.max()).then_some(Kind::Dense(Box::new(lu)))?
            }
            _ => sparse(size, &entries)?,
        };
        let factor = Factor { rows, columns, kind };
        (size <= DENSE || factor.has_full_rank()).then_some(factor)
    }

    /// A vector of ones of either sign must not grow out of all proportion: a bound of the condition from below,
    /// which sees a rank that is missing but for rounding.
    fn has_full_rank(&self) -> bool {
        let mut sign = 1u32;
        let mut x = DMatrix::from_fn(self.rows.len(), 1, |_, _| {
            sign = sign.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            if sign >> 31 == 0 { 1.0 } else { -1.0 }
        });
        self.back(&mut x) && x.iter().all(|v| v.abs() < 1.0 / RANK)
    }

    /// Solves columns in place; `false` where it could not be done.
    fn apply(&self, x: &mut DMatrix<f64>) -> bool {
        self.rows.iter().enumerate().for_each(|(r, factor)| x.row_mut(r).scale_mut(*factor));
        let done = self.back(x);
        self.columns.iter().enumerate().for_each(|(c, factor)| x.row_mut(c).scale_mut(*factor));
        done
    }

    fn back(&self, x: &mut DMatrix<f64>) -> bool {
        match &self.kind {
            Kind::Empty => true,
            Kind::Dense(lu) => lu.solve_mut(x),
            Kind::Sparse(parts) => {
                let (size, columns) = x.shape();
                let scratch = parts.0.solve_in_place_scratch::<f64>(columns, Par::Seq);
                let Ok(mut memory) = MemBuffer::try_new(scratch) else { return false };
                let x = MatMut::from_column_major_slice_mut(x.as_mut_slice(), size, columns);
                let factor = lu::LuRef::new_unchecked(&parts.0, &parts.1);
                factor.solve_in_place_with_conj(Conj::No, x, Par::Seq, MemStack::new(&mut memory));
                true
            }
        }
    }
}

fn inverse(largest: f64) -> f64 {
    if largest > 0.0 { 1.0 / largest } else { 1.0 }
}

/// `entries` sorted by columns, then rows, each place once.
fn sparse(size: usize, entries: &[Entry]) -> Option<Kind> {
    let mut start = vec![0; size + 1];
    entries.iter().for_each(|&(_, c, _)| start[c + 1] += 1);
    for c in 0..size {
        start[c + 1] += start[c];
    }
    let row: Vec<usize> = entries.iter().map(|&(r, ..)| r).collect();
    let value: Vec<f64> = entries.iter().map(|&(.., v)| v).collect();
    let pattern = SymbolicSparseColMatRef::new_checked(size, size, &start, None, &row);
    let symbolic = lu::factorize_symbolic_lu(pattern, Default::default()).ok()?;
    let mut numeric = lu::NumericLu::new();
    let scratch = symbolic.factorize_numeric_lu_scratch::<f64>(Par::Seq, Default::default());
    let mut memory = MemBuffer::try_new(scratch).ok()?;
    let matrix = SparseColMatRef::new(pattern, &value);
    let stack = MemStack::new(&mut memory);
    symbolic.factorize_numeric_lu(&mut numeric, matrix, Par::Seq, stack, Default::default()).ok()?;
    Some(Kind::Sparse(Box::new((symbolic, numeric))))
}

/// Entries by columns, then rows, those of one place summed.
fn summed(entries: &[Entry]) -> Vec<Entry> {
    let mut sorted = entries.to_vec();
    sorted.sort_by_key(|&(r, c, _)| (c, r));
    let mut summed: Vec<Entry> = Vec::with_capacity(sorted.len());
    for (r, c, v) in sorted {
        match summed.last_mut() {
            Some(last) if (last.0, last.1) == (r, c) => last.2 += v,
            _ => summed.push((r, c, v)),
        }
    }
    summed
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A chain of resistances with one controlled entry, large enough to be sparse.
    fn chain(size: usize) -> Vec<Entry> {
        let mut entries = vec![(0, 0, 1.0), (size / 2, 3, 0.25)];
        for k in 1..size {
            entries.extend([(k, k, 1.0), (k - 1, k - 1, 1.0), (k, k - 1, -1.0), (k - 1, k, -1.0)]);
        }
        entries
    }

    #[test]
    fn sparse_and_dense_agree() {
        let size = 3 * DENSE;
        let entries = chain(size);
        let right = DMatrix::from_fn(size, 2, |r, c| ((r * 7 + c * 3) % 11) as f64 - 5.0);
        let sparse = solve(size, &entries, right.clone()).unwrap();
        let dense = solved(&dense(size, &entries), &right).unwrap();
        assert!((&sparse - &dense).amax() <= 1e-9 * dense.amax());
    }

    #[test]
    fn a_missing_rank_is_seen() {
        let size = 3 * DENSE;
        let mut entries = chain(size);
        // the last node hangs on nothing: its row and column are gone but for rounding
        entries.retain(|&(r, c, _)| r != size - 1 && c != size - 1);
        entries.push((size - 2, size - 2, -1.0));
        entries.extend([(size - 1, size - 1, 1.0), (size - 1, size - 2, -1.0), (size - 2, size - 1, -1.0)]);
        entries.push((size - 2, size - 2, 1.0));
        entries.extend([(0, 0, -1.0)]);
        entries.retain(|&(r, c, _)| (r, c) != (size / 2, 3));
        assert!(solve(size, &entries, DMatrix::from_element(size, 1, 1.0)).is_none());
    }
}
