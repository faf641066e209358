//! A stage of a large system: the symmetric matrix is factored as LDLᵀ with a small shift on its diagonal, which
//! refinement takes back. Its pattern never changes, so it is ordered once.

use super::super::lower::{Kind, Lower};
use super::solver::Pattern;
use super::system::{Mode, System, TIE};

/// Pattern number and length of the stage.
type Key = (u32, u64);

/// Factors kept at most, and numbers in them.
const MOST_FACTORS: usize = 24;
const MOST_NUMBERS: usize = 16_000_000;

/// Shift of a diagonal, as a share of what is typical there.
const SHIFT: f64 = 1e-8;

/// Rounds of refinement at most, and the share of the largest at which they end.
const MOST_ROUNDS: usize = 8;
const REFINED: f64 = 1e-11;

/// Pattern, order and numbers.
pub(super) struct Sparse {
    matrix: Lower,
    is_current: Vec<bool>,
    /// Place of each entry, in the order in which the system tells them; upper ones have none.
    slots: Vec<u32>,
    diagonal: Vec<usize>,
    /// Numbers of the matrix as it is.
    values: Vec<f64>,
    values_key: Option<Key>,
    factors: Vec<(Key, Vec<f64>)>,
    residual: Vec<f64>,
}

impl Sparse {
    pub(super) fn new(system: &System) -> Option<Self> {
        if system.one_sided {
            return None;
        }
        let n = system.unknowns();
        let modes = vec![Mode::Blocking; system.junctions.len()];
        let closed = vec![false; system.gates.len()];
        let mut told: Vec<(u32, u32)> = Vec::new();
        system.entries(&modes, &closed, &|_| 1.0, |row, col, _| told.push((col, row)));
        let pairs = told.iter().copied().filter(|(col, row)| row >= col);
        let matrix = Lower::new(Kind::Signed, n, pairs, MOST_NUMBERS)?;
        Some(Sparse {
            is_current: system.is_current.clone(),
            values: vec![0.0; matrix.entries()],
            residual: vec![0.0; n],
            slots: told.iter().map(|&(col, row)| matrix.place(col, row)).collect(),
            diagonal: (0..n as u32).map(|k| matrix.place(k, k) as usize).collect(),
            matrix,
            values_key: None,
            factors: Vec::new(),
        })
    }

    pub(super) fn cost(&self) -> u64 {
        8 * (self.matrix.factor_length() + self.matrix.entries()) as u64
    }

    /// Makes matrix and factor those of a pattern and a length.
    pub(super) fn prepare(
        &mut self,
        system: &System,
        pattern: &Pattern,
        key: Key,
        g: &dyn Fn(usize) -> f64,
        count: &mut u64,
    ) -> bool {
        let is_kept = key.1 != u64::MAX;
        if is_kept && self.values_key == Some(key) {
            return true;
        }
        self.values.fill(0.0);
        let (values, slots) = (&mut self.values, &self.slots);
        let mut told = 0;
        system.entries(&pattern.modes, &pattern.closed, g, |_, _, value| {
            if let Some(entry) = slots.get(told).and_then(|&slot| values.get_mut(slot as usize)) {
                *entry += value;
            }
            told += 1;
        });
        self.values_key = Some(key);
        if let Some(at) = self.factors.iter().position(|(known, _)| is_kept && *known == key) {
            // the factor in use stands last
            let factor = self.factors.remove(at);
            self.factors.push(factor);
            return true;
        }
        *count += 1;
        self.factor(key)
    }

    fn factor(&mut self, key: Key) -> bool {
        let most = (MOST_NUMBERS / self.matrix.factor_length().max(1)).clamp(1, MOST_FACTORS);
        let mut numbers = if self.factors.len() >= most {
            self.factors.remove(0).1
        } else {
            vec![0.0; self.matrix.factor_length()]
        };
        let mut shifted = self.values.clone();
        let typical = self.typical();
        for (row, &at) in self.diagonal.iter().enumerate() {
            let own = self.values[at].abs();
            if self.is_current[row] {
                shifted[at] -= SHIFT * (own + 1.0 / typical);
            } else {
                shifted[at] += SHIFT * if own > 2.0 * TIE { own } else { typical };
            }
        }
        let is_done = self.matrix.factor(&shifted, &mut numbers);
        self.factors.push((key, numbers));
        is_done
    }

    /// Median of the conductances on the diagonal.
    fn typical(&self) -> f64 {
        let own = |row: &usize| self.values[self.diagonal[*row]].abs();
        let mut all: Vec<f64> = (0..self.diagonal.len())
            .filter(|&r| !self.is_current[r])
            .map(|r| own(&r))
            .filter(|v| *v > 2.0 * TIE)
            .collect();
        all.sort_by(f64::total_cmp);
        all.get(all.len() / 2).copied().unwrap_or(1.0)
    }

    /// Solves with the factor alone.
    pub(super) fn rough(&mut self, right: &[f64], out: &mut [f64]) {
        out.copy_from_slice(right);
        let Some((_, numbers)) = self.factors.last() else { return };
        self.matrix.solve(numbers, out);
    }

    /// Solves, starting from what `unknowns` holds. `false` where the rounds do not settle.
    pub(super) fn solve(&mut self, right: &[f64], unknowns: &mut [f64]) -> bool {
        let mut residual = std::mem::take(&mut self.residual);
        let mut step = vec![0.0; residual.len()];
        let mut is_settled = false;
        for _ in 0..MOST_ROUNDS {
            self.matrix.miss(&self.values, right, unknowns, &mut residual);
            self.rough(&residual, &mut step);
            let (mut moved, mut most) = ([0.0f64; 2], [0.0f64; 2]);
            for ((value, change), &kind) in unknowns.iter_mut().zip(&step).zip(&self.is_current) {
                *value += change;
                moved[usize::from(kind)] = moved[usize::from(kind)].max(change.abs());
                most[usize::from(kind)] = most[usize::from(kind)].max(value.abs());
            }
            if !(moved[0] + moved[1]).is_finite() {
                break;
            }
            is_settled = true;
            if moved[0] <= REFINED * most[0] && moved[1] <= REFINED * most[1] {
                break;
            }
        }
        self.residual = residual;
        if !is_settled {
            unknowns.fill(0.0);
        }
        is_settled
    }
}
