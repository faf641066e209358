//! Combinations of states without full rank: a line of solutions, as far as the inequalities let it reach.

use super::outcome::{Interval, Place};
use super::ports::{EMPTY, NOTHING, Ports, Trial};
use nalgebra::{DMatrix, DVector};

/// Singular values below this are none: rows are of size 1.
const CUTOFF: f64 = 1e-9;

impl Ports {
    /// A system without full rank: if it is consistent, the set extends along its null space as far as the
    /// inequalities let it.
    pub(super) fn continuum(
        &self,
        earlier: &DVector<f64>,
        matrix: &DMatrix<f64>,
        right: &DVector<f64>,
        block: &[usize],
        places: &[Place],
    ) -> Option<Trial> {
        let (matrix, right) = self.weighed(matrix, right)?;
        let svd = matrix.clone().svd(true, true);
        let part = svd.solve(&right, CUTOFF).ok()?;
        let miss = (&matrix * &part - &right).amax();
        if miss > 1e-8 * right.amax().max(1e-9) {
            return None;
        }
        let null = svd.v_t.as_ref()?;
        let (last, _) = svd.singular_values.argmin();
        let mut a = earlier.clone();
        let mut direction = DVector::zeros(a.len());
        for (r, &k) in block.iter().enumerate() {
            a[k] = part[r];
            direction[k] = null[(last, r)];
        }
        let room = self.extent(&a, &direction, block, places)?;
        let middle = match (room.low.is_finite(), room.high.is_finite()) {
            (true, true) => (room.low + room.high) / 2.0,
            (true, false) => room.low,
            (false, true) => room.high,
            (false, false) => 0.0,
        };
        let at = &a + &direction * middle;
        let mut trial = self.judged(at, block, places)?;
        let room = Interval { low: room.low - middle, high: room.high - middle };
        if room.high - room.low > 1e-9 {
            block.iter().for_each(|&k| trial.places[k] = places[k]);
            trial.open.push((direction, room));
        }
        Some(trial)
    }

    /// Rows brought to size 1; one that says nothing but for rounding must agree as it stands, and is then nothing.
    fn weighed(&self, matrix: &DMatrix<f64>, right: &DVector<f64>) -> Option<(DMatrix<f64>, DVector<f64>)> {
        let (mut matrix, mut right) = (matrix.clone(), right.clone());
        let levels = self.laws.iter().map(|law| law.forward.value).fold(self.size(), f64::max);
        for r in 0..matrix.nrows() {
            let largest = matrix.row(r).amax();
            if largest > EMPTY {
                matrix.row_mut(r).scale_mut(1.0 / largest);
                right[r] /= largest;
            } else if right[r].abs() > NOTHING * levels {
                return None;
            } else {
                matrix.row_mut(r).fill(0.0);
                right[r] = 0.0;
            }
        }
        Some((matrix, right))
    }

    /// How far `a` may move along `direction` before an inequality fails.
    fn extent(
        &self,
        a: &DVector<f64>,
        direction: &DVector<f64>,
        block: &[usize],
        places: &[Place],
    ) -> Option<Interval> {
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
        for &k in block {
            let (law, place) = (&self.laws[k], &places[k]);
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
}
