//! What the junctions of a part see of its linear rest, and every set of states that agrees with it. Each junction
//! is first replaced by a source `a` behind a resistance `rho`, so that the reduction has an answer whether
//! junctions are needed for conduction or stand in the way of it: v = a + rho·i.

use super::dense::Dense;
use super::network::{Junction, Law, Network};
use super::outcome::{Interval, Place, View};
use nalgebra::{DMatrix, DVector};

/// Share of the largest voltage or current below which a difference is nothing.
const NOTHING: f64 = 1e-10;
/// Ratio of pivots below which a system has no full rank.
const RANK: f64 = 1e-11;

/// The reduced part.
pub(super) struct Ports {
    pub(super) junctions: Vec<u32>,
    laws: Vec<Junction>,
    rho: f64,
    x0: DVector<f64>,
    x_of_a: DMatrix<f64>,
    v0: DVector<f64>,
    v_of_a: DMatrix<f64>,
    i0: DVector<f64>,
    i_of_a: DMatrix<f64>,
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

impl Ports {
    /// `None` where the linear rest has no unique answer even with junctions as resistances.
    pub(super) fn new(network: &Network, dense: &Dense<'_>) -> Option<Self> {
        let rho = typical_resistance(network, dense);
        let (size, count) = (dense.rhs.len(), dense.junctions.len());
        let mut rows = DMatrix::zeros(count, size);
        let mut constant = DVector::zeros(count);
        for (k, &n) in dense.junctions.iter().enumerate() {
            let (row, c) = dense.voltage_row(n);
            for (x, factor) in row {
                rows[(k, x)] += factor;
            }
            constant[k] = c;
        }
        let coupled = &dense.ports / rho;
        let matrix = &dense.matrix + &coupled * &rows;
        let mut right = DMatrix::zeros(size, count + 1);
        right.set_column(0, &(DVector::from_column_slice(&dense.rhs) - &coupled * &constant));
        right.columns_mut(1, count).copy_from(&coupled);
        let solution = solved(&matrix, &right)?;
        let x0 = solution.column(0).into_owned();
        let x_of_a = solution.columns(1, count).into_owned();
        let v0 = &rows * &x0 + constant;
        let v_of_a = &rows * &x_of_a;
        let i0 = &v0 / rho;
        let i_of_a = (&v_of_a - DMatrix::identity(count, count)) / rho;
        let junction = |&n: &u32| match network.branches[n as usize].law {
            Law::Junction(j) => Some(j),
            _ => None,
        };
        let laws = dense.junctions.iter().filter_map(junction).collect();
        Some(Ports { junctions: dense.junctions.clone(), laws, rho, x0, x_of_a, v0, v_of_a, i0, i_of_a })
    }

    fn choices(&self, k: usize) -> u64 {
        if self.laws[k].reverse.is_some() { 3 } else { 2 }
    }

    /// Number of combinations of states.
    pub(super) fn combinations(&self) -> u64 {
        (0..self.laws.len()).fold(1u64, |n, k| n.saturating_mul(self.choices(k)))
    }

    /// Consistent sets, and whether all combinations were tried.
    pub(super) fn consistent(&self, most: u64) -> (Vec<Trial>, bool) {
        let all = self.combinations();
        let mut found: Vec<Trial> = Vec::new();
        for number in 0..all.min(most) {
            let mut rest = number;
            let places: Vec<Place> = (0..self.laws.len())
                .map(|k| {
                    let choice = rest % self.choices(k);
                    rest /= self.choices(k);
                    [Place::Blocking, Place::Conducting, Place::Breakdown][choice as usize]
                })
                .collect();
            if let Some(trial) = self.attempt(&places) {
                self.keep(&mut found, trial);
            }
        }
        (found, all <= most)
    }

    /// Keeps a set that is not one of those found.
    fn keep(&self, found: &mut Vec<Trial>, trial: Trial) {
        let inside = |point: &Trial, set: &Trial| match &set.open[..] {
            [] => self.same(&point.currents, &set.currents),
            [(direction, room), ..] => {
                let away = &point.currents - &set.currents;
                let t = away.dot(direction) / direction.norm_squared();
                let reach = 1e-7 * (1.0 + t.abs());
                self.same(&point.currents, &(&set.currents + direction * t))
                    && t >= room.low - reach
                    && t <= room.high + reach
            }
        };
        if found.iter().any(|other| inside(&trial, other)) {
            return;
        }
        found.retain(|other| !(other.open.is_empty() && inside(other, &trial)));
        found.push(trial);
    }

    fn same(&self, a: &DVector<f64>, b: &DVector<f64>) -> bool {
        let size = a.amax().max(b.amax()).max(self.v0.amax() * 1e-3);
        (a - b).amax() <= 1e-8 * size
    }

    /// Law rows of a set of states: `matrix · a = right`.
    fn rows(&self, places: &[Place]) -> (DMatrix<f64>, DVector<f64>) {
        let count = self.laws.len();
        let mut matrix = DMatrix::zeros(count, count);
        let mut right = DVector::zeros(count);
        for (k, (law, place)) in self.laws.iter().zip(places).enumerate() {
            let level = match place {
                Place::Conducting | Place::Open => Some(law.forward.value),
                Place::Breakdown => law.reverse.map(|r| -r.value),
                _ => None,
            };
            match level {
                Some(level) => {
                    let row = self.v_of_a.row(k) - self.i_of_a.row(k) * law.series;
                    matrix.set_row(k, &row);
                    right[k] = level - self.v0[k] + law.series * self.i0[k];
                }
                None => {
                    matrix.set_row(k, &(self.i_of_a.row(k) * self.rho));
                    right[k] = -self.i0[k] * self.rho;
                }
            }
        }
        (matrix, right)
    }

    fn attempt(&self, places: &[Place]) -> Option<Trial> {
        let (matrix, right) = self.rows(places);
        match solved(&matrix, &DMatrix::from_column_slice(right.len(), 1, right.as_slice())) {
            Some(a) => self.judged(a.column(0).into_owned(), places),
            None => self.continuum(&matrix, &right, places),
        }
    }

    /// Voltage and current of each junction at `a`.
    fn at(&self, a: &DVector<f64>) -> (DVector<f64>, DVector<f64>) {
        (&self.v0 + &self.v_of_a * a, &self.i0 + &self.i_of_a * a)
    }

    fn room(&self, v: &DVector<f64>, i: &DVector<f64>) -> (f64, f64) {
        let largest = self.laws.iter().map(|l| l.forward.value).fold(0.0, f64::max);
        let volts = v.amax().max(largest).max(self.rho * i.amax()).max(self.v0.amax());
        (NOTHING * volts, NOTHING * volts / self.rho)
    }

    /// The set, if every inequality holds.
    fn judged(&self, a: DVector<f64>, places: &[Place]) -> Option<Trial> {
        let (v, i) = self.at(&a);
        let (volts, amperes) = self.room(&v, &i);
        let mut found = Vec::with_capacity(places.len());
        for (k, (law, place)) in self.laws.iter().zip(places).enumerate() {
            let inner = v[k] - law.series * i[k];
            let reverse = law.reverse.map_or(f64::INFINITY, |r| r.value);
            let holds = match place {
                Place::Conducting => i[k] >= -amperes,
                Place::Breakdown => i[k] <= amperes,
                _ => inner <= law.forward.value + volts && inner >= -reverse - volts,
            };
            if !holds || !inner.is_finite() {
                return None;
            }
            found.push(if i[k].abs() <= amperes { Place::Blocking } else { *place });
        }
        Some(Trial { currents: a, places: found, open: Vec::new() })
    }

    /// A system without full rank: if it is consistent, the set extends along its null space as far as the
    /// inequalities let it.
    fn continuum(&self, matrix: &DMatrix<f64>, right: &DVector<f64>, places: &[Place]) -> Option<Trial> {
        let svd = matrix.clone().svd(true, true);
        let largest = svd.singular_values.max();
        let a = svd.solve(right, 1e-9 * largest).ok()?;
        let miss = (matrix * &a - right).amax();
        if miss > 1e-8 * right.amax().max(1e-9) {
            return None;
        }
        let null = svd.v_t.as_ref()?;
        let (last, _) = svd.singular_values.argmin();
        let direction: DVector<f64> = null.row(last).transpose();
        let room = self.extent(&a, &direction, places)?;
        let middle = match (room.low.is_finite(), room.high.is_finite()) {
            (true, true) => (room.low + room.high) / 2.0,
            (true, false) => room.low,
            (false, true) => room.high,
            (false, false) => 0.0,
        };
        let at = &a + &direction * middle;
        let mut trial = self.judged(at, places)?;
        let room = Interval { low: room.low - middle, high: room.high - middle };
        if room.high - room.low > 1e-9 {
            for (place, assumed) in trial.places.iter_mut().zip(places) {
                *place = *assumed;
            }
            trial.open.push((direction, room));
        }
        Some(trial)
    }

    /// How far `a` may move along `direction` before an inequality fails.
    fn extent(&self, a: &DVector<f64>, direction: &DVector<f64>, places: &[Place]) -> Option<Interval> {
        let (v, i) = self.at(a);
        let (dv, di) = (&self.v_of_a * direction, &self.i_of_a * direction);
        let mut room = Interval { low: f64::NEG_INFINITY, high: f64::INFINITY };
        let (volts, amperes) = self.room(&v, &i);
        let mut limit = |value: f64, slope: f64, nothing: f64| {
            // value + slope·t ≥ 0
            if slope.abs() <= 1e-9 * nothing / NOTHING {
                return value >= -nothing;
            }
            let t = -value / slope;
            if slope > 0.0 {
                room.low = room.low.max(t)
            } else {
                room.high = room.high.min(t)
            }
            true
        };
        for (k, (law, place)) in self.laws.iter().zip(places).enumerate() {
            let (inner, change) = (v[k] - law.series * i[k], dv[k] - law.series * di[k]);
            let holds = match place {
                Place::Conducting => limit(i[k], di[k], amperes),
                Place::Breakdown => limit(-i[k], -di[k], amperes),
                _ => {
                    limit(law.forward.value - inner, -change, volts)
                        && law.reverse.is_none_or(|r| limit(inner + r.value, change, volts))
                }
            };
            if !holds {
                return None;
            }
        }
        (room.high >= room.low - 1e-9).then_some(room)
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

    /// What junction `k` sees, the others in their places.
    pub(super) fn view(&self, k: usize, places: &[Place], v: f64, i: f64) -> Option<View> {
        let (mut matrix, mut right) = self.rows(places);
        matrix.set_row(k, &(self.i_of_a.row(k) * self.rho));
        right[k] = -self.i0[k] * self.rho;
        let mut both = DMatrix::zeros(right.len(), 2);
        both.set_column(0, &right);
        both[(k, 1)] = self.rho;
        let a = solved(&matrix, &both)?;
        let open_circuit = self.v0[k] + (self.v_of_a.row(k) * a.column(0))[0];
        let slope = (self.v_of_a.row(k) * a.column(1))[0];
        let _ = (v, i);
        let view = View { open_circuit, resistance: self.laws[k].series - slope };
        (view.open_circuit.is_finite() && view.resistance.is_finite()).then_some(view)
    }
}

/// Geometric mean of the part's resistances, moved off any round ratio to them: a negative resistance beside its
/// own magnitude would leave no answer.
fn typical_resistance(network: &Network, dense: &Dense<'_>) -> f64 {
    let logs = dense.branches.iter().filter_map(|&n| match network.branches[n as usize].law {
        Law::Resistance(r) => Some(r.abs().ln()),
        _ => None,
    });
    let (sum, count) = logs.fold((0.0, 0usize), |(s, c), l| (s + l, c + 1));
    1.618_033_988_7 * if count == 0 { 1e3 } else { (sum / count as f64).exp() }
}

/// Solves a square system after scaling rows and columns; `None` without full rank.
fn solved(matrix: &DMatrix<f64>, right: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let n = matrix.nrows();
    if n == 0 {
        return Some(right.clone());
    }
    let inverse = |largest: f64| if largest > 0.0 { 1.0 / largest } else { 1.0 };
    let rows: Vec<f64> = (0..n).map(|r| inverse(matrix.row(r).amax())).collect();
    let mut scaled = matrix.clone();
    for (r, factor) in rows.iter().enumerate() {
        scaled.row_mut(r).scale_mut(*factor);
    }
    let columns: Vec<f64> = (0..n).map(|c| inverse(scaled.column(c).amax())).collect();
    for (c, factor) in columns.iter().enumerate() {
        scaled.column_mut(c).scale_mut(*factor);
    }
    let mut rhs = right.clone();
    for (r, factor) in rows.iter().enumerate() {
        rhs.row_mut(r).scale_mut(*factor);
    }
    let lu = scaled.clone().full_piv_lu();
    let pivots = lu.u().diagonal().abs();
    if pivots.min() <= RANK * pivots.max() {
        return None;
    }
    let mut x = lu.solve(&rhs)?;
    let correction = lu.solve(&(&rhs - &scaled * &x))?;
    x += correction;
    for (c, factor) in columns.iter().enumerate() {
        x.row_mut(c).scale_mut(*factor);
    }
    x.iter().all(|v| v.is_finite()).then_some(x)
}
