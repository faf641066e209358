//! A stage of a small system, condensed: states at its end, tests and unknowns as sums over states at its start and
//! inputs, with factors worked out once. Scaled rows, then Gaussian elimination with partial pivoting (nalgebra).

use super::solver::{Answer, Pattern};
use super::system::{Cell, LEAK, Mode, System};
use nalgebra::DMatrix;

/// The factors, row by row: states at the start, inputs, constant.
pub(crate) struct Condensed {
    states: usize,
    inputs: usize,
    /// Of the states at the end, then of the tests.
    rows: Vec<f64>,
    /// Of all unknowns.
    unknowns: Vec<f64>,
}

impl Condensed {
    pub(super) fn new(system: &System, pattern: &Pattern, g: &dyn Fn(usize) -> f64) -> Option<Self> {
        let (n, m, k) = (system.unknowns(), system.cells.len(), system.inputs);
        let width = m + k + 1;
        let mut matrix = DMatrix::<f64>::zeros(n, n);
        system.entries(&pattern.modes, &pattern.closed, g, |row, col, value| {
            matrix[(row as usize, col as usize)] += value;
        });
        let mut right = right_sides(system, pattern, g);
        let leaks = leaks(system, &pattern.modes);
        leaks.iter().for_each(|&at| matrix.column_mut(at).scale_mut(LEAK));
        scale_rows(&mut matrix, &mut right);
        if n > 0 && !matrix.lu().solve_mut(&mut right) {
            return None;
        }
        leaks.iter().for_each(|&at| right.row_mut(at).scale_mut(LEAK));
        if right.iter().any(|v| !v.is_finite()) {
            return None;
        }
        let unknowns: Vec<f64> =
            (0..n).flat_map(|row| right.row(row).iter().copied().collect::<Vec<_>>()).collect();
        let mut condensed = Condensed { states: m, inputs: k, rows: Vec::new(), unknowns };
        condensed.rows.reserve((m + system.junctions.len()) * width);
        for cell in &system.cells {
            condensed.push_state(cell, width);
        }
        for (junction, mode) in system.junctions.iter().zip(&pattern.modes) {
            let factor = if *mode == Mode::Blocking { 1.0 / LEAK } else { 1.0 };
            let at = junction.current as usize * width;
            let row: Vec<f64> = condensed.unknowns[at..at + width].iter().map(|v| v * factor).collect();
            condensed.rows.extend(row);
        }
        Some(condensed)
    }

    fn push_state(&mut self, cell: &Cell, width: usize) {
        let mut row = vec![0.0; width];
        let mut add = |unknown: u32, factor: f64| {
            let at = unknown as usize * width;
            for (to, from) in row.iter_mut().zip(&self.unknowns[at..at + width]) {
                *to += factor * from;
            }
        };
        match cell {
            Cell::Inductance { current, .. } => add(*current, 1.0),
            Cell::Capacitance { across, .. } => {
                for &(unknown, factor) in &across.unknowns {
                    add(unknown, factor);
                }
                for &(input, factor) in &across.inputs {
                    row[self.states + input as usize] += factor;
                }
                row[width - 1] += across.constant;
            }
        }
        self.rows.extend(row);
    }

    pub(super) fn size(&self) -> usize {
        self.rows.len() + self.unknowns.len()
    }

    /// States at the end and tests. `false` where a number is not finite.
    pub(super) fn stage(&self, from: &[f64], inputs: &[f64], answer: &mut Answer) -> bool {
        let width = self.states + self.inputs + 1;
        answer.states.clear();
        answer.tests.clear();
        let mut rows = self.rows.chunks_exact(width);
        let mut all = 0.0;
        for row in rows.by_ref().take(self.states) {
            let value = self.sum(row, from, inputs);
            all += value;
            answer.states.push(value);
        }
        for row in rows {
            answer.tests.push(self.sum(row, from, inputs));
        }
        all.is_finite()
    }

    fn sum(&self, row: &[f64], from: &[f64], inputs: &[f64]) -> f64 {
        let (states, rest) = row.split_at(self.states);
        let (driven, constant) = rest.split_at(self.inputs);
        let mut sum = constant[0];
        for (factor, value) in states.iter().zip(from) {
            sum += factor * value;
        }
        for (factor, value) in driven.iter().zip(inputs) {
            sum += factor * value;
        }
        sum
    }

    /// All unknowns.
    pub(super) fn unknowns(&self, from: &[f64], inputs: &[f64], out: &mut [f64]) {
        let width = self.states + self.inputs + 1;
        for (value, row) in out.iter_mut().zip(self.unknowns.chunks_exact(width)) {
            *value = self.sum(row, from, inputs);
        }
    }

    /// What changes of the states at the start make of state `row` at the end.
    pub(super) fn transfer(&self, row: usize, changes: &[f64]) -> f64 {
        let at = row * (self.states + self.inputs + 1);
        self.rows[at..at + self.states].iter().zip(changes).map(|(factor, change)| factor * change).sum()
    }
}

/// Currents of blocking junctions: their voltages are solved for in their place. As a current among others of its node
/// such a leak would be lost in their rounding, and its voltage with it.
fn leaks(system: &System, modes: &[Mode]) -> Vec<usize> {
    let blocking = system.junctions.iter().zip(modes).filter(|(_, mode)| **mode == Mode::Blocking);
    blocking.map(|(junction, _)| junction.current as usize).collect()
}

/// One column for each state at the start, each input, and the constant.
fn right_sides(system: &System, pattern: &Pattern, g: &dyn Fn(usize) -> f64) -> DMatrix<f64> {
    let (n, m, k) = (system.unknowns(), system.cells.len(), system.inputs);
    let mut from = vec![0.0; m];
    let mut inputs = vec![0.0; k];
    let mut constant = vec![0.0; n];
    let mut column = vec![0.0; n];
    system.right_side(&pattern.modes, &pattern.closed, g, &from, &inputs, &mut constant);
    let mut right = DMatrix::<f64>::zeros(n, m + k + 1);
    for at in 0..m + k {
        let slot = if at < m { &mut from[at] } else { &mut inputs[at - m] };
        *slot = 1.0;
        system.right_side(&pattern.modes, &pattern.closed, g, &from, &inputs, &mut column);
        let slot = if at < m { &mut from[at] } else { &mut inputs[at - m] };
        *slot = 0.0;
        for row in 0..n {
            right[(row, at)] = column[row] - constant[row];
        }
    }
    for row in 0..n {
        right[(row, m + k)] = constant[row];
    }
    right
}

/// Divides each row by its largest entry, so that pivots compare.
fn scale_rows(matrix: &mut DMatrix<f64>, right: &mut DMatrix<f64>) {
    for row in 0..matrix.nrows() {
        let largest = matrix.row(row).iter().fold(0.0f64, |most, v| most.max(v.abs()));
        if largest > 0.0 {
            matrix.row_mut(row).iter_mut().for_each(|v| *v /= largest);
            right.row_mut(row).iter_mut().for_each(|v| *v /= largest);
        }
    }
}
