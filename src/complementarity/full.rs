//! Every set of states of a part whose linear rest has no answer of its own: each combination is solved whole. For
//! small parts only; what even then is not determined is said to be so.

use super::double_double::Dd;
use super::equations::{Entry, Equations};
use super::linear;
use super::network::Junction;
use super::outcome::Place;
use nalgebra::{DMatrix, DVector};

/// Work spent at most, in multiplications.
const WORK: u64 = 100_000_000;

/// A consistent set: unknowns, then junction currents.
pub(super) struct Whole {
    pub(super) x: Vec<f64>,
    pub(super) places: Vec<Place>,
}

/// All consistent sets; `None` where there are too many combinations or one of them is not determined.
pub(super) fn enumerate(equations: &Equations<'_>) -> Option<Vec<Whole>> {
    let laws: Vec<Junction> = equations.bundles.iter().map(|b| b.law).collect();
    let choices = |k: usize| if laws[k].reverse.is_some() { 3u64 } else { 2 };
    let all = (0..laws.len()).fold(1u64, |n, k| n.saturating_mul(choices(k)));
    let size = (equations.rhs.len() + laws.len()) as u64;
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
        let (entries, rhs) = system(equations, &places);
        match linear::refined(rhs.len(), &entries, &rhs) {
            Some(x) => {
                let x: Vec<f64> = x.into_iter().map(Dd::round).collect();
                if holds(equations, &laws, &places, &x) && !found.iter().any(|other| same(&other.x, &x)) {
                    found.push(Whole { x, places });
                }
            }
            None if contradicts(&linear::dense(rhs.len(), &entries), &rounded(&rhs)) => {}
            None => return None,
        }
    }
    Some(found)
}

/// The part's equations, then the law of each junction in its place.
fn system(equations: &Equations<'_>, places: &[Place]) -> (Vec<Entry>, Vec<Dd>) {
    let size = equations.rhs.len();
    let mut entries = equations.matrix.clone();
    entries.extend(equations.ports.iter().map(|&(row, port, factor)| (row, size + port, factor)));
    let mut rhs = equations.rhs.clone();
    for (k, (bundle, place)) in equations.bundles.iter().zip(places).enumerate() {
        let row = size + k;
        let level = match place {
            Place::Conducting => bundle.law.forward.value,
            Place::Breakdown => -bundle.law.reverse.map_or(0.0, |r| r.value),
            _ => {
                entries.push((row, row, 1.0));
                rhs.push(Dd::ZERO);
                continue;
            }
        };
        let (terms, constant) = equations.voltage_row(bundle.members[0]);
        entries.extend(terms.into_iter().map(|(x, factor)| (row, x, factor)));
        entries.push((row, row, -bundle.law.series));
        rhs.push(Dd::from(level) - constant);
    }
    (entries, rhs)
}

/// Unknowns, then junction currents, of junctions in these places, with twice the digits, where these places are known to
/// have one answer; `None` where that many digits cannot be had.
pub(super) fn exactly(equations: &Equations<'_>, places: &[Place]) -> Option<Vec<Dd>> {
    let (entries, rhs) = system(equations, places);
    linear::refined_of_full_rank(rhs.len(), &entries, &rhs)
}

fn rounded(list: &[Dd]) -> DVector<f64> {
    DVector::from_iterator(list.len(), list.iter().map(|v| v.round()))
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

fn holds(equations: &Equations<'_>, laws: &[Junction], places: &[Place], x: &[f64]) -> bool {
    let size = equations.rhs.len();
    let volts = x[..equations.nodes.len()].iter().fold(1e-12, |m: f64, v| m.max(v.abs()));
    let amperes = x[equations.nodes.len()..].iter().fold(0.0, |m: f64, i| m.max(i.abs()));
    laws.iter().zip(places).enumerate().all(|(k, (law, place))| {
        let (row, constant) = equations.voltage_row(equations.bundles[k].members[0]);
        let constant = constant.round();
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
