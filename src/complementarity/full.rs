//! Every set of states of a part whose linear rest has no answer of its own: each combination is solved whole. For
//! small parts only; what even then is not determined is said to be so.

use super::dense::Dense;
use super::network::{Junction, Law, Network};
use super::outcome::Place;
use super::ports::solved;
use nalgebra::{DMatrix, DVector};

/// Work spent at most, in multiplications.
const WORK: u64 = 100_000_000;

/// A consistent set: unknowns, then junction currents.
pub(super) struct Whole {
    pub(super) x: Vec<f64>,
    pub(super) places: Vec<Place>,
}

/// All consistent sets; `None` where there are too many combinations or one of them is not determined.
pub(super) fn enumerate(network: &Network, dense: &Dense<'_>) -> Option<Vec<Whole>> {
    let laws: Vec<Junction> = dense
        .junctions
        .iter()
        .filter_map(|&n| match network.branches[n as usize].law {
            Law::Junction(j) => Some(j),
            _ => None,
        })
        .collect();
    let choices = |k: usize| if laws[k].reverse.is_some() { 3u64 } else { 2 };
    let all = (0..laws.len()).fold(1u64, |n, k| n.saturating_mul(choices(k)));
    let size = (dense.rhs.len() + laws.len()) as u64;
    if all.saturating_mul(size.pow(3)) > WORK {
        return None;
    }
    let mut found: Vec<Whole> = Vec::new();
    for number in 0..all {
        let mut rest = number;
        let mut places = Vec::with_capacity(laws.len());
        for k in 0..laws.len() {
            places.push([Place::Blocking, Place::Conducting, Place::Breakdown][(rest % choices(k)) as usize]);
            rest /= choices(k);
        }
        let (matrix, rhs) = system(dense, &laws, &places);
        match solved(&matrix, &DMatrix::from_column_slice(rhs.len(), 1, rhs.as_slice())) {
            Some(x) => {
                let x: Vec<f64> = x.iter().copied().collect();
                if holds(dense, &laws, &places, &x) && !found.iter().any(|other| same(&other.x, &x)) {
                    found.push(Whole { x, places });
                }
            }
            None if contradicts(&matrix, &rhs) => {}
            None => return None,
        }
    }
    Some(found)
}

/// The part's equations, then the law of each junction in its place.
fn system(dense: &Dense<'_>, laws: &[Junction], places: &[Place]) -> (DMatrix<f64>, DVector<f64>) {
    let (size, count) = (dense.rhs.len(), laws.len());
    let mut matrix = DMatrix::zeros(size + count, size + count);
    matrix.view_mut((0, 0), (size, size)).copy_from(&dense.matrix);
    matrix.view_mut((0, size), (size, count)).copy_from(&dense.ports);
    let mut rhs = DVector::zeros(size + count);
    rhs.rows_mut(0, size).copy_from_slice(&dense.rhs);
    for (k, (law, place)) in laws.iter().zip(places).enumerate() {
        let level = match place {
            Place::Conducting => law.forward.value,
            Place::Breakdown => -law.reverse.map_or(0.0, |r| r.value),
            _ => {
                matrix[(size + k, size + k)] = 1.0;
                continue;
            }
        };
        let (row, constant) = dense.voltage_row(dense.junctions[k]);
        for (x, factor) in row {
            matrix[(size + k, x)] += factor;
        }
        matrix[(size + k, size + k)] -= law.series;
        rhs[size + k] = level - constant;
    }
    (matrix, rhs)
}

/// Whether no solution exists at all, by least squares on scaled rows.
fn contradicts(matrix: &DMatrix<f64>, rhs: &DVector<f64>) -> bool {
    let (mut scaled, mut right) = (matrix.clone(), rhs.clone());
    for r in 0..scaled.nrows() {
        let largest = scaled.row(r).amax();
        if largest > 0.0 {
            scaled.row_mut(r).scale_mut(1.0 / largest);
            right[r] /= largest;
        }
    }
    let svd = scaled.clone().svd(true, true);
    let Ok(x) = svd.solve(&right, 1e-10 * svd.singular_values.max()) else { return false };
    (&scaled * x - &right).amax() > 1e-7 * right.amax()
}

fn holds(dense: &Dense<'_>, laws: &[Junction], places: &[Place], x: &[f64]) -> bool {
    let size = dense.rhs.len();
    let volts = x[..dense.nodes.len()].iter().fold(1e-12, |m: f64, v| m.max(v.abs()));
    let amperes = x[dense.nodes.len()..].iter().fold(0.0, |m: f64, i| m.max(i.abs()));
    laws.iter().zip(places).enumerate().all(|(k, (law, place))| {
        let (row, constant) = dense.voltage_row(dense.junctions[k]);
        let v = row.iter().map(|&(n, c)| c * x[n]).sum::<f64>() + constant;
        let inner = v - law.series * x[size + k];
        let room = 1e-10 * (volts + constant.abs());
        match place {
            Place::Conducting => x[size + k] >= -1e-10 * amperes,
            Place::Breakdown => x[size + k] <= 1e-10 * amperes,
            _ => inner <= law.forward.value + room && law.reverse.is_none_or(|r| inner >= -r.value - room),
        }
    })
}

fn same(a: &[f64], b: &[f64]) -> bool {
    let size = a.iter().chain(b).fold(0.0, |m: f64, v| m.max(v.abs()));
    a.iter().zip(b).all(|(a, b)| (a - b).abs() <= 1e-8 * size)
}
