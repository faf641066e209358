//! The periodic state: the states at the beginning of a period that come back at its end. Newton's method on the map
//! of one period with the derivative that the steps carry along (Aprille & Trick, Proc. IEEE 60 (1972) 108-114); in
//! large systems, extrapolation from the last periods (Anderson, J. ACM 12 (1965) 547-560).

use super::march::{End, March};
use nalgebra::{DMatrix, DVector};

/// Systems with more cells than this are extrapolated.
const MOST_CELLS: usize = 40;

/// Periods that extrapolation looks back upon.
const DEPTH: usize = 8;

/// Miss of the period, as a share of each state's scale, that is aimed at, and that counts as periodic.
const AIM: f64 = 1e-10;
const PERIODIC: f64 = 1e-6;

/// Rounds at most, and rounds without a better miss after which the best is taken.
const MOST_ROUNDS: usize = 400;
const PATIENCE: usize = 12;

/// One walk through a period.
pub(crate) type Walk<'a> = dyn FnMut(&mut March) -> End + 'a;

/// What was found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Orbit {
    /// How the last walk ended.
    pub end: End,
    /// Whether the states come back.
    pub periodic: bool,
    /// Periods walked through.
    pub periods: u64,
}

/// Brings the march to the beginning of a period that repeats itself, as nearly as it can be had.
pub(crate) fn find_orbit(march: &mut March, walk: &mut Walk<'_>) -> Orbit {
    let m = march.states.len();
    let mut orbit = Orbit { end: End::Done, periodic: true, periods: 0 };
    let by_derivative = m <= MOST_CELLS && march.solver.is_condensed();
    let mut history = History::default();
    let (mut best, mut stale) = (f64::INFINITY, 0);
    let mut best_start: Option<Vec<f64>> = None;
    let mut jumps = Jumps::default();
    for _ in 0..MOST_ROUNDS {
        let start = march.states.clone();
        let modes = march.solver.modes().to_vec();
        march.derivative = by_derivative.then(|| identity(m));
        orbit.end = walk(march);
        orbit.periods += 1;
        let derivative = march.derivative.take();
        if orbit.end != End::Done {
            orbit.periodic = best <= PERIODIC;
            return orbit;
        }
        let miss = miss(march, &start);
        if miss < 0.5 * best {
            stale = 0;
        } else {
            stale += 1;
        }
        if miss < best {
            best = miss;
            best_start = Some(march.states.clone());
        }
        orbit.periodic = best <= PERIODIC;
        if miss <= AIM || (orbit.periodic && stale >= 3) || (best <= 1e2 * PERIODIC && stale >= PATIENCE) {
            break;
        }
        let end = march.states.clone();
        history.push(&start, &end);
        let next = match derivative {
            Some(derivative) if jumps.may(miss) => newton(m, &derivative, &start, &end),
            None if jumps.may(miss) => history.extrapolate(march),
            _ => None,
        };
        if let Some(next) = next.filter(|next| next.iter().all(|v| v.is_finite())) {
            march.states = next;
            march.solver.set_modes(&modes);
        }
    }
    if let Some(best) = best_start {
        march.states = best;
    }
    orbit
}

/// Whether a jump ahead is worth while: not right after one that made things worse.
#[derive(Default)]
struct Jumps {
    before: Option<f64>,
    rest: u32,
    penalty: u32,
}

impl Jumps {
    fn may(&mut self, miss: f64) -> bool {
        if self.rest > 0 {
            self.rest -= 1;
            self.before = None;
            return false;
        }
        if self.before.is_some_and(|before| miss > 0.8 * before) {
            self.penalty = (self.penalty + 1).min(5);
            self.rest = self.penalty;
            self.before = None;
            return false;
        }
        self.before = Some(miss);
        true
    }
}

/// Largest difference between end and start, by scale.
fn miss(march: &March, start: &[f64]) -> f64 {
    let floors = super::march::floors(march.solver.system(), &march.most);
    let cells = march.solver.system().cells.iter().zip(&march.most);
    let differences = march.states.iter().zip(start);
    let shares = differences
        .zip(cells)
        .map(|((end, start), (cell, most))| (end - start).abs() / most.max(floors[super::march::kind(cell)]));
    shares.fold(0.0, f64::max)
}

fn identity(m: usize) -> Vec<f64> {
    (0..m * m).map(|n| if n % (m + 1) == 0 { 1.0 } else { 0.0 }).collect()
}

/// The fixed point of the map as far as its derivative tells; directions that come back by themselves are kept.
fn newton(m: usize, derivative: &[f64], start: &[f64], end: &[f64]) -> Option<Vec<f64>> {
    let matrix = DMatrix::identity(m, m) - DMatrix::from_column_slice(m, m, derivative);
    let gap = DVector::from_iterator(m, end.iter().zip(start).map(|(end, start)| end - start));
    let inverse = matrix.pseudo_inverse(1e-9).ok()?;
    let step = inverse * gap;
    Some(start.iter().zip(step.iter()).map(|(start, step)| start + step).collect())
}

/// The last periods' starts and ends.
#[derive(Default)]
struct History {
    pairs: Vec<(Vec<f64>, Vec<f64>)>,
}

impl History {
    fn push(&mut self, start: &[f64], end: &[f64]) {
        if self.pairs.len() > DEPTH {
            self.pairs.remove(0);
        }
        self.pairs.push((start.to_vec(), end.to_vec()));
    }

    /// The mixture of the last ends whose misses cancel best.
    fn extrapolate(&mut self, march: &March) -> Option<Vec<f64>> {
        let last = self.pairs.len().checked_sub(1)?;
        if last == 0 {
            return None;
        }
        let m = march.states.len();
        let scale: Vec<f64> = march.most.iter().map(|most| 1.0 / most.max(1e-12)).collect();
        let gap = |n: usize| {
            let (start, end) = &self.pairs[n];
            DVector::from_iterator(m, (0..m).map(|k| (end[k] - start[k]) * scale[k]))
        };
        let newest = gap(last);
        let columns: Vec<DVector<f64>> = (0..last).map(|n| &newest - gap(n)).collect();
        let matrix = DMatrix::from_columns(&columns);
        // normal equations with a little weight on small mixtures: the columns may be nearly alike
        let square = matrix.transpose() * &matrix;
        let ridge = 1e-12 * square.trace().max(f64::MIN_POSITIVE);
        let square = square + DMatrix::identity(last, last) * ridge;
        let weights = square.lu().solve(&(matrix.transpose() * &newest))?;
        let mut next = self.pairs[last].1.clone();
        for (n, weight) in weights.iter().enumerate() {
            for (k, value) in next.iter_mut().enumerate() {
                *value -= weight * (self.pairs[last].1[k] - self.pairs[n].1[k]);
            }
        }
        Some(next)
    }
}
