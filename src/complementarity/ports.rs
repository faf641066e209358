//! What the junctions of a part see of its linear rest, and every set of states that agrees with it. Each junction
//! is first replaced by a source `a` behind a resistance `rho`, so that the reduction has an answer whether
//! junctions are needed for conduction or stand in the way of it: v = a + rho·i.

use super::dense::Dense;
use super::network::{Junction, Law, Network};
use super::outcome::{Interval, Place, View};
use nalgebra::{DMatrix, DVector, RowDVector};

/// Share of the largest voltage or current below which a difference is nothing.
const NOTHING: f64 = 1e-10;
/// Ratio of pivots below which a system has no full rank.
const RANK: f64 = 1e-11;

/// Greatest amplification from a junction to a junction that double precision can still carry.
const BLOWN_UP: f64 = 1e10;
/// Work spent on the combinations of one block, in multiplications.
const WORK: u64 = 50_000_000;
/// Combinations without full rank tried at most: each costs many times an ordinary one.
const MOST_SINGULAR: usize = 300;
/// Sets kept at most while blocks are put together.
const MOST_KEPT: usize = 64;

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

impl Trial {
    /// Nothing decided yet.
    fn start(count: usize) -> Self {
        Trial { currents: DVector::zeros(count), places: vec![Place::Blocking; count], open: Vec::new() }
    }
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
        // a rest that blows the smallest input up this far has no full rank but for rounding
        if v_of_a.amax() > BLOWN_UP {
            return None;
        }
        Some(Ports { junctions: dense.junctions.clone(), laws, rho, x0, x_of_a, v0, v_of_a, i0, i_of_a })
    }

    fn choices(&self, k: usize) -> u64 {
        if self.laws[k].reverse.is_some() { 3 } else { 2 }
    }

    /// Number of combinations of states in some junctions.
    fn combinations(&self, block: &[usize]) -> u64 {
        block.iter().fold(1u64, |n, &k| n.saturating_mul(self.choices(k)))
    }

    /// Consistent sets, and whether all combinations were tried. Junctions are taken in blocks that only listen to
    /// earlier ones, so that combinations multiply within a block alone.
    pub(super) fn consistent(&self) -> (Vec<Trial>, bool) {
        let count = self.laws.len();
        let mut sets = vec![Trial::start(count)];
        let mut complete = true;
        let blocks = self.blocks();
        for block in &blocks {
            let mut more = Vec::new();
            for set in &sets {
                complete &= self.extend(set, block, &mut more);
                complete &= more.len() <= MOST_KEPT;
                more.truncate(MOST_KEPT);
            }
            sets = more;
        }
        (sets, complete)
    }

    /// Every way in which a block's junctions can join a set of earlier ones.
    fn extend(&self, set: &Trial, block: &[usize], more: &mut Vec<Trial>) -> bool {
        let all = self.combinations(block);
        // the work of one combination is a dense solve
        let most = (WORK / (block.len() as u64 + 1).pow(3)).max(1);
        let mut found: Vec<Trial> = Vec::new();
        let mut singular = 0;
        for number in 0..all.min(most) {
            if singular > MOST_SINGULAR {
                return self.give_up(set, block, found, more);
            }
            let mut rest = number;
            let mut places = set.places.clone();
            for &k in block {
                let choice = rest % self.choices(k);
                rest /= self.choices(k);
                places[k] = [Place::Blocking, Place::Conducting, Place::Breakdown][choice as usize];
            }
            if let Some(trial) = self.attempt(set, block, &places, &mut singular) {
                self.keep(&mut found, trial);
            }
        }
        if all > most {
            return self.give_up(set, block, found, more);
        }
        more.append(&mut found);
        true
    }

    /// Not all combinations were tried: what was found stands, or what assumed states find.
    fn give_up(&self, set: &Trial, block: &[usize], mut found: Vec<Trial>, more: &mut Vec<Trial>) -> bool {
        if found.is_empty() {
            found.extend(self.pivot(set, block));
        }
        more.append(&mut found);
        false
    }

    /// One set by assumed states, where there are too many combinations to try: all that fail change, then the first
    /// that fails (Murty 1974).
    fn pivot(&self, set: &Trial, block: &[usize]) -> Option<Trial> {
        for start in [Place::Conducting, Place::Blocking] {
            let mut places = set.places.clone();
            block.iter().for_each(|&k| places[k] = start);
            for round in 0..20 + 4 * block.len() {
                let a = self.solve_block(set, block, &places)?;
                let (v, i) = self.at(&a);
                let (volts, amperes) = self.room(&v, &i);
                let wrong: Vec<(usize, Place)> = block
                    .iter()
                    .filter_map(|&k| self.better(k, places[k], v[k], i[k], volts, amperes).map(|p| (k, p)))
                    .collect();
                if wrong.is_empty() {
                    return self.judged(a, block, &places);
                }
                let one = if round < 20 { wrong.len() } else { 1 };
                wrong.iter().take(one).for_each(|&(k, place)| places[k] = place);
            }
        }
        None
    }

    /// The place that a junction should have instead, if its assumption fails.
    fn better(&self, k: usize, place: Place, v: f64, i: f64, volts: f64, amperes: f64) -> Option<Place> {
        let law = &self.laws[k];
        let inner = v - law.series * i;
        match place {
            Place::Conducting if i < -amperes => Some(Place::Blocking),
            Place::Breakdown if i > amperes => Some(Place::Blocking),
            Place::Blocking if inner > law.forward.value + volts => Some(Place::Conducting),
            Place::Blocking if law.reverse.is_some_and(|r| inner < -r.value - volts) => {
                Some(Place::Breakdown)
            }
            _ => None,
        }
    }

    /// Junctions that listen to each other, each block after those that it listens to.
    fn blocks(&self) -> Vec<Vec<usize>> {
        let count = self.laws.len();
        let mut graph = petgraph::graph::DiGraph::<(), (), u32>::with_capacity(count, count * count);
        let nodes: Vec<_> = (0..count).map(|_| graph.add_node(())).collect();
        for j in 0..count {
            let largest = self.v_of_a.row(j).amax();
            for k in (0..count).filter(|&k| k != j) {
                if self.v_of_a[(j, k)].abs() > 1e-12 * largest {
                    graph.add_edge(nodes[k], nodes[j], ());
                }
            }
        }
        // listed so that what is listened to comes last
        let mut blocks: Vec<Vec<usize>> = petgraph::algo::kosaraju_scc(&graph)
            .into_iter()
            .map(|block| block.into_iter().map(|n| n.index()).collect())
            .collect();
        blocks.iter_mut().for_each(|b: &mut Vec<usize>| b.sort_unstable());
        blocks.reverse();
        blocks
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

    /// Law row of junction `k` in a place: `row · a = level`.
    fn row(&self, k: usize, place: Place) -> (RowDVector<f64>, f64) {
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

    fn attempt(&self, set: &Trial, block: &[usize], places: &[Place], singular: &mut usize) -> Option<Trial> {
        let mut trial = match self.solve_block(set, block, places) {
            Some(a) => self.judged(a, block, places)?,
            None => {
                *singular += 1;
                let (matrix, right) = self.block_rows(set, block, places);
                self.continuum(&set.currents, &matrix, &right, block, places)?
            }
        };
        trial.open.splice(0..0, set.open.iter().cloned());
        Some(trial)
    }

    /// Law rows of a block, what earlier blocks contribute on the right.
    fn block_rows(&self, set: &Trial, block: &[usize], places: &[Place]) -> (DMatrix<f64>, DVector<f64>) {
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

    fn solve_block(&self, set: &Trial, block: &[usize], places: &[Place]) -> Option<DVector<f64>> {
        let (matrix, right) = self.block_rows(set, block, places);
        let solution = solved(&matrix, &DMatrix::from_column_slice(right.len(), 1, right.as_slice()))?;
        let mut a = set.currents.clone();
        for (r, &k) in block.iter().enumerate() {
            a[k] = solution[(r, 0)];
        }
        Some(a)
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
    fn judged(&self, a: DVector<f64>, block: &[usize], places: &[Place]) -> Option<Trial> {
        let (v, i) = self.at(&a);
        let (volts, amperes) = self.room(&v, &i);
        let mut found = places.to_vec();
        for &k in block {
            let (law, place) = (&self.laws[k], &places[k]);
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
            found[k] = if i[k].abs() <= amperes { Place::Blocking } else { *place };
        }
        Some(Trial { currents: a, places: found, open: Vec::new() })
    }

    /// A system without full rank: if it is consistent, the set extends along its null space as far as the
    /// inequalities let it.
    fn continuum(
        &self,
        earlier: &DVector<f64>,
        matrix: &DMatrix<f64>,
        right: &DVector<f64>,
        block: &[usize],
        places: &[Place],
    ) -> Option<Trial> {
        let svd = matrix.clone().svd(true, true);
        let largest = svd.singular_values.max();
        let part = svd.solve(right, 1e-9 * largest).ok()?;
        let miss = (matrix * &part - right).amax();
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
    pub(super) fn view(&self, k: usize, places: &[Place]) -> Option<View> {
        let (mut matrix, mut right) = self.rows(places);
        matrix.set_row(k, &(self.i_of_a.row(k) * self.rho));
        right[k] = -self.i0[k] * self.rho;
        let mut both = DMatrix::zeros(right.len(), 2);
        both.set_column(0, &right);
        both[(k, 1)] = self.rho;
        let a = solved(&matrix, &both)?;
        let open_circuit = self.v0[k] + (self.v_of_a.row(k) * a.column(0))[0];
        let slope = (self.v_of_a.row(k) * a.column(1))[0];
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
pub(super) fn solved(matrix: &DMatrix<f64>, right: &DMatrix<f64>) -> Option<DMatrix<f64>> {
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
