//! What the junctions of a part see of its linear rest, and every set of states that agrees with it. Each junction
//! is first replaced by a source `a` behind a resistance `rho`, so that the reduction has an answer whether
//! junctions are needed for conduction or stand in the way of it: v = a + rho·i.

use super::equations::{Entry, Equations};
use super::linear;
use super::network::{Junction, Law, Network};
use super::outcome::{Interval, Place, View};
use nalgebra::{DMatrix, DVector, RowDVector};

/// Share of the largest voltage or current below which a difference is nothing.
pub(super) const NOTHING: f64 = 1e-10;
/// Greatest amplification from a junction to a junction that double precision can still carry.
const BLOWN_UP: f64 = 1e10;
/// What a junction's law may be but for rounding where it says nothing: its coefficients are near 1 otherwise.
pub(super) const EMPTY: f64 = 1e-13;
/// Numbers in the reduction at most.
const MOST_NUMBERS: usize = 30_000_000;

/// The reduced part: for each bundle of junctions its law, its voltage and its current as functions of all `a`.
pub(super) struct Ports {
    pub(super) laws: Vec<Junction>,
    pub(super) rho: f64,
    x0: DVector<f64>,
    x_of_a: DMatrix<f64>,
    pub(super) v0: DVector<f64>,
    pub(super) v_of_a: DMatrix<f64>,
    pub(super) i0: DVector<f64>,
    pub(super) i_of_a: DMatrix<f64>,
}

/// A consistent set.
#[derive(Debug, Clone)]
pub(super) struct Trial {
    /// Sources behind the resistances.
    pub(super) currents: DVector<f64>,
    pub(super) places: Vec<Place>,
    /// Directions in which the set extends, and how far.
    pub(super) open: Vec<(DVector<f64>, Interval)>,
}

impl Trial {
    /// Nothing decided yet.
    pub(super) fn start(count: usize) -> Self {
        Trial { currents: DVector::zeros(count), places: vec![Place::Blocking; count], open: Vec::new() }
    }
}

impl Ports {
    /// `None` where the linear rest has no unique answer even with junctions as resistances.
    pub(super) fn new(network: &Network, equations: &Equations<'_>) -> Option<Self> {
        let rho = typical_resistance(network, equations);
        let (size, count) = (equations.rhs.len(), equations.bundles.len());
        if size.saturating_mul(count + 1) > MOST_NUMBERS {
            return None;
        }
        let rows: Vec<_> = equations.bundles.iter().map(|b| equations.voltage_row(b.members[0])).collect();
        let mut matrix = equations.matrix.clone();
        let mut right = DMatrix::zeros(size, count + 1);
        right.set_column(0, &DVector::from_iterator(size, equations.rhs.iter().map(|v| v.round())));
        for &(row, k, factor) in &equations.ports {
            let factor = factor / rho;
            matrix.extend(rows[k].0.iter().map(|&(x, c)| -> Entry { (row, x, factor * c) }));
            right[(row, 0)] -= factor * rows[k].1.round();
            right[(row, k + 1)] += factor;
        }
        let solution = linear::solve(size, &matrix, right)?;
        let voltage = |k: usize, column: usize| -> f64 {
            rows[k].0.iter().map(|&(x, c)| c * solution[(x, column)]).sum()
        };
        let v0 = DVector::from_fn(count, |k, _| voltage(k, 0) + rows[k].1.round());
        let v_of_a = DMatrix::from_fn(count, count, |k, a| voltage(k, a + 1));
        // a rest that blows the smallest input up this far has no full rank but for rounding
        if count > 0 && v_of_a.amax() > BLOWN_UP {
            return None;
        }
        Some(Ports {
            laws: equations.bundles.iter().map(|b| b.law).collect(),
            rho,
            x0: solution.column(0).into_owned(),
            x_of_a: solution.columns(1, count).into_owned(),
            i0: &v0 / rho,
            i_of_a: (&v_of_a - DMatrix::identity(count, count)) / rho,
            v0,
            v_of_a,
        })
    }

    /// Largest voltage of the junctions with every `a` at zero.
    pub(super) fn size(&self) -> f64 {
        if self.v0.is_empty() { 0.0 } else { self.v0.amax() }
    }

    /// Law row of junction `k` in a place: `row · a = level`; a current where it blocks stands times `rho`.
    pub(super) fn row(&self, k: usize, place: Place) -> (RowDVector<f64>, f64) {
        let law = &self.laws[k];
        let level = match place {
            Place::Conducting | Place::Open => Some(law.forward.value),
            Place::Breakdown => law.reverse.map(|r| -r.value),
            _ => None,
        };
        match level {
            Some(level) => {
                let row = self.v_of_a.row(k) - self.i_of_a.row(k) * law.series;
                (row, level - self.v0[k] + law.series * self.i0[k])
            }
            None => (self.i_of_a.row(k) * self.rho, -self.i0[k] * self.rho),
        }
    }

    /// Law rows of a set of states: `matrix · a = right`.
    fn rows(&self, places: &[Place]) -> (DMatrix<f64>, DVector<f64>) {
        let count = self.laws.len();
        let mut matrix = DMatrix::zeros(count, count);
        let mut right = DVector::zeros(count);
        for (k, &place) in places.iter().enumerate() {
            let (row, level) = self.row(k, place);
            matrix.set_row(k, &row);
            right[k] = level;
        }
        (matrix, right)
    }

    /// Law rows of a block, what earlier blocks contribute on the right.
    pub(super) fn block_rows(
        &self,
        set: &Trial,
        block: &[usize],
        places: &[Place],
    ) -> (DMatrix<f64>, DVector<f64>) {
        let size = block.len();
        let mut matrix = DMatrix::zeros(size, size);
        let mut right = DVector::zeros(size);
        for (r, &k) in block.iter().enumerate() {
            let (row, level) = self.row(k, places[k]);
            let known: f64 =
                (0..row.len()).filter(|c| !block.contains(c)).map(|c| row[c] * set.currents[c]).sum();
            right[r] = level - known;
            for (c, &other) in block.iter().enumerate() {
                matrix[(r, c)] = row[other];
            }
        }
        (matrix, right)
    }

    /// `a` in which a block's junctions are in their places; `None` without full rank.
    pub(super) fn solve_block(&self, set: &Trial, block: &[usize], places: &[Place]) -> Option<DVector<f64>> {
        let (matrix, right) = self.block_rows(set, block, places);
        // scaling would blow the rounding of a row that says nothing up into a law
        if (0..block.len()).any(|r| matrix.row(r).amax() <= EMPTY) {
            return None;
        }
        let solution =
            linear::solved(&matrix, &DMatrix::from_column_slice(right.len(), 1, right.as_slice()))?;
        let mut a = set.currents.clone();
        for (r, &k) in block.iter().enumerate() {
            a[k] = solution[(r, 0)];
        }
        Some(a)
    }

    /// Voltage and current of each junction at `a`.
    pub(super) fn at(&self, a: &DVector<f64>) -> (DVector<f64>, DVector<f64>) {
        (&self.v0 + &self.v_of_a * a, &self.i0 + &self.i_of_a * a)
    }

    pub(super) fn room(&self, v: &DVector<f64>, i: &DVector<f64>) -> (f64, f64) {
        let largest = self.laws.iter().map(|l| l.forward.value).fold(0.0, f64::max);
        let volts = v.amax().max(largest).max(self.rho * i.amax()).max(self.v0.amax());
        (NOTHING * volts, NOTHING * volts / self.rho)
    }

    /// Unknowns, then junction currents.
    pub(super) fn expand(&self, a: &DVector<f64>) -> Vec<f64> {
        let x = &self.x0 + &self.x_of_a * a;
        let i = &self.i0 + &self.i_of_a * a;
        let (_, amperes) = self.room(&(&self.v0 + &self.v_of_a * a), &i);
        let i = i.iter().map(|&i| if i.abs() <= amperes { 0.0 } else { i });
        x.iter().copied().chain(i).collect()
    }

    /// Currents beneath this are rounding.
    pub(super) fn rounding(&self, a: &DVector<f64>) -> f64 {
        let (v, i) = self.at(a);
        1e-3 * self.room(&v, &i).1
    }

    pub(super) fn expand_change(&self, direction: &DVector<f64>) -> Vec<f64> {
        let x = &self.x_of_a * direction;
        let i = &self.i_of_a * direction;
        x.iter().chain(i.iter()).copied().collect()
    }

    /// What each junction sees, the others in their places: how its current answers to its level where it carries
    /// one, and its voltage to a current where it blocks.
    pub(super) fn views(&self, places: &[Place]) -> Vec<Option<View>> {
        let count = self.laws.len();
        let (matrix, right) = self.rows(places);
        let mut both = DMatrix::identity(count, count + 1);
        both.set_column(count, &right);
        let Some(a) = linear::solved(&matrix, &both) else { return vec![None; count] };
        let here = a.column(count).into_owned();
        (0..count)
            .map(|k| {
                let response = a.column(k).into_owned();
                let (v, i) = (self.v0[k] + self.v_of_a.row(k).dot(&here.transpose()), self.i_of_a.row(k));
                let now = self.i0[k] + i.dot(&here.transpose());
                let view = match places[k] {
                    Place::Conducting | Place::Open | Place::Breakdown => {
                        let slope = i.dot(&response.transpose());
                        let inner = v - self.laws[k].series * now;
                        View { open_circuit: inner - now / slope, resistance: -1.0 / slope }
                    }
                    _ => {
                        let slope = self.v_of_a.row(k).dot(&response.transpose()) * self.rho;
                        View { open_circuit: v, resistance: self.laws[k].series - slope }
                    }
                };
                (view.open_circuit.is_finite() && view.resistance.is_finite()).then_some(view)
            })
            .collect()
    }
}

/// Geometric mean of the part's resistances, moved off any round ratio to them: a negative resistance beside its
/// own magnitude would leave no answer.
fn typical_resistance(network: &Network, equations: &Equations<'_>) -> f64 {
    let logs = equations.branches.iter().filter_map(|&n| match network.branches[n as usize].law {
        Law::Resistance(r) => Some(r.abs().ln()),
        _ => None,
    });
    let (sum, count) = logs.fold((0.0, 0usize), |(s, c), l| (s + l, c + 1));
    1.618_033_988_7 * if count == 0 { 1e3 } else { (sum / count as f64).exp() }
}
