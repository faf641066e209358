//! The periodic state: the states at the beginning of a period that come back at its end. Newton's method on the map
//! of one period with the derivative that the steps carry along (Aprille & Trick, Proc. IEEE 60 (1972) 108-114); in
//! large systems, extrapolation from the last periods (Anderson, J. ACM 12 (1965) 547-560).

use super::march::{End, March};
use super::system::Mode;
use nalgebra::{DMatrix, DVector};

/// Systems with more cells than this are extrapolated.
const MOST_CELLS: usize = 40;

/// Periods that extrapolation looks back upon.
const DEPTH: usize = 8;

/// Miss of the period, as a share of each state's scale, that is aimed at, and that counts as periodic.
const AIM: f64 = 1e-10;
const PERIODIC: f64 = 1e-6;

/// Rounds at most, and rounds without a much better miss after which the best is taken.
const MOST_ROUNDS: usize = 400;
const MOST_STALE: usize = 60;
/// Such rounds by derivatives, after which extrapolation has its turn.
const MOST_STALE_BY_DERIVATIVE: usize = 20;

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
    let mut search = Search {
        by_derivative: march.states.len() <= MOST_CELLS && march.solver.is_condensed(),
        orbit: Orbit { end: End::Done, periodic: false, periods: 0 },
        best: None,
        source: Source::Steps,
        differences: 0,
        damping: 1.0,
        direction: None,
        history: History::default(),
        jumps: Jumps::default(),
    };
    let mut stale = 0;
    let mut least = f64::INFINITY;
    for _ in 0..MOST_ROUNDS {
        let Some(point) = search.round(march, walk) else { break };
        stale = if point.miss < 0.5 * least { 0 } else { stale + 1 };
        least = least.min(point.miss);
        if point.miss <= AIM || (least <= PERIODIC && stale >= 3) || stale >= MOST_STALE {
            search.keep_better(point);
            break;
        }
        let next = if search.by_derivative && stale >= MOST_STALE_BY_DERIVATIVE {
            stale = 0;
            search.keep_better(point);
            search.extrapolate_from_best(march)
        } else {
            search.next(march, walk, point)
        };
        match next.filter(|next| next.iter().all(|v| v.is_finite())) {
            Some(next) => march.states = next,
            None => break,
        }
    }
    let mut orbit = search.orbit;
    if let Some(best) = search.best {
        orbit.periodic = best.miss <= PERIODIC;
        march.states = best.end;
        march.solver.set_modes(&best.modes);
    }
    orbit
}

/// One period that was walked through.
#[derive(Clone)]
struct Point {
    start: Vec<f64>,
    end: Vec<f64>,
    /// Modes at its start.
    modes: Vec<Mode>,
    miss: f64,
    /// Of the end by the start, by columns, as the steps carry it along.
    derivative: Option<Vec<f64>>,
}

/// Where the derivative of a period comes from. The one that the steps carry along holds the instants of change still;
/// where moving them matters, differences of whole periods tell.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Source {
    Steps,
    Differences,
}

struct Search {
    by_derivative: bool,
    orbit: Orbit,
    best: Option<Point>,
    source: Source,
    /// How often differences were taken.
    differences: u32,
    damping: f64,
    /// From the best point on.
    direction: Option<Vec<f64>>,
    history: History,
    jumps: Jumps,
}

/// A Newton step that leaves more of the miss than this calls for a better derivative.
const HEADWAY: f64 = 0.4;

/// Change of a state by which differences are taken, as a share of the largest of its kind.
const DIFFERENCE: f64 = 1e-4;

/// Most cells and most times for differences.
const MOST_DIFFERENCES: (usize, u32) = (24, 12);

impl Search {
    /// Walks through one period from where the march is.
    fn round(&mut self, march: &mut March, walk: &mut Walk<'_>) -> Option<Point> {
        let m = march.states.len();
        let (start, modes) = (march.states.clone(), march.solver.modes().to_vec());
        march.forget();
        march.derivative = self.by_derivative.then(|| identity(m));
        self.orbit.end = walk(march);
        self.orbit.periods += 1;
        let derivative = march.derivative.take();
        if self.orbit.end != End::Done {
            return None;
        }
        let miss = miss(march, &start);
        Some(Point { start, end: march.states.clone(), modes, miss, derivative })
    }

    fn keep_better(&mut self, point: Point) {
        if self.best.as_ref().is_none_or(|best| point.miss < best.miss) {
            self.best = Some(point);
        }
    }

    /// Where the next period should start.
    fn next(&mut self, march: &mut March, walk: &mut Walk<'_>, point: Point) -> Option<Vec<f64>> {
        if !self.by_derivative {
            self.history.push(&point.start, &point.end);
            let next = if self.jumps.may(point.miss) { self.history.extrapolate(march) } else { None };
            let end = point.end.clone();
            self.keep_better(point);
            return Some(next.unwrap_or(end));
        }
        let before = self.best.as_ref().map(|best| best.miss);
        if before.is_none_or(|before| point.miss < before) {
            if before.is_some_and(|before| point.miss > HEADWAY * before) {
                self.source = Source::Differences;
            }
            self.best = Some(point);
            self.damping = 1.0;
            self.direction = self.newton(march, walk);
        } else if self.damping > 0.05 && self.direction.is_some() {
            self.damping *= 0.3;
        } else if self.source == Source::Steps {
            self.source = Source::Differences;
            self.damping = 1.0;
            self.direction = self.newton(march, walk);
        } else {
            self.direction = None;
        }
        let best = self.best.as_mut()?;
        march.solver.set_modes(&best.modes);
        match &self.direction {
            Some(direction) => {
                let step = best.start.iter().zip(direction);
                Some(step.map(|(start, step)| start + self.damping * step).collect())
            }
            None if self.differences < MOST_DIFFERENCES.1 && best.start.len() <= MOST_DIFFERENCES.0 => {
                // on by itself; whatever comes of it is the new best
                best.miss = f64::INFINITY;
                self.source = Source::Steps;
                Some(best.end.clone())
            }
            None => self.extrapolate_from_best(march),
        }
    }

    /// No derivative has led there: extrapolation takes over.
    fn extrapolate_from_best(&mut self, march: &mut March) -> Option<Vec<f64>> {
        self.by_derivative = false;
        let best = self.best.as_ref()?;
        march.solver.set_modes(&best.modes);
        Some(best.end.clone())
    }

    /// From the best point to the fixed point of the map as far as its derivative tells; directions that come back
    /// by themselves are kept.
    fn newton(&mut self, march: &mut March, walk: &mut Walk<'_>) -> Option<Vec<f64>> {
        let best = self.best.clone()?;
        let m = best.start.len();
        // of the singular values that the inverse is made of
        march.spent += 30 * (m * m * m) as u64;
        let scale = scales(march);
        let may_differ = m <= MOST_DIFFERENCES.0 && self.differences < MOST_DIFFERENCES.1;
        let derivative = match self.source {
            Source::Differences if may_differ => self.by_differences(march, walk, &best, &scale)?,
            // taken before, they have not led there, and the other one still less
            Source::Differences if self.differences > 0 => return None,
            _ => best.derivative.clone()?,
        };
        let entry = |row: usize, col: usize| {
            let same = if row == col { 1.0 } else { 0.0 };
            same - derivative[col * m + row] * scale[col] / scale[row]
        };
        let inverse = DMatrix::from_fn(m, m, entry).pseudo_inverse(1e-7).ok()?;
        let gap = best.end.iter().zip(&best.start).zip(&scale).map(|((end, start), s)| (end - start) / s);
        let step = inverse * DVector::from_iterator(m, gap);
        Some(step.iter().zip(&scale).map(|(v, s)| v * s).collect())
    }

    /// The derivative by walking through the period from states that differ a little, one after the other.
    fn by_differences(
        &mut self,
        march: &mut March,
        walk: &mut Walk<'_>,
        best: &Point,
        scale: &[f64],
    ) -> Option<Vec<f64>> {
        self.differences += 1;
        let mut derivative = Vec::with_capacity(scale.len() * scale.len());
        for (n, s) in scale.iter().enumerate() {
            march.states.clone_from(&best.start);
            march.states[n] += DIFFERENCE * s;
            march.solver.set_modes(&best.modes);
            let end = walk(march);
            self.orbit.periods += 1;
            if end != End::Done {
                self.orbit.end = end;
                return None;
            }
            derivative.extend(march.states.iter().zip(&best.end).map(|(a, b)| (a - b) / (DIFFERENCE * s)));
        }
        Some(derivative)
    }
}

/// The scale of each state: its largest value in the last period, or a share of the largest of its kind.
fn scales(march: &March) -> Vec<f64> {
    let floors = super::march::floors(march.solver.system(), &march.most);
    let cells = march.solver.system().cells.iter().zip(&march.most);
    cells.map(|(cell, most)| most.max(floors[super::march::kind(cell)])).collect()
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
    let ends = march.states.iter().zip(start).zip(scales(march));
    ends.map(|((end, start), scale)| (end - start).abs() / scale).fold(0.0, f64::max)
}

fn identity(m: usize) -> Vec<f64> {
    (0..m * m).map(|n| if n % (m + 1) == 0 { 1.0 } else { 0.0 }).collect()
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
