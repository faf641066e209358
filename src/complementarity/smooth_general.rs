//! One part with controlled laws or negative resistances and smooth junctions: Newton's method on what the junctions
//! see of the linear rest. Such a part may have several answers or none; the one nearest to the piecewise-linear
//! answer is looked for, if need be by raising all sources from nothing, and what does not settle is said.

use super::curve::{Curve, Point};
use super::double_double::Dd;
use super::equations::Equations;
use super::linear::solved;
use super::network::{Junction, Law, Network};
use super::outcome::{Place, Solution};
use super::parts::Piece;
use super::ports::Ports;
use super::rails::Rails;
use super::smooth::{Smooth, Smoothness};
use super::smooth_passive::limit;
use nalgebra::{DMatrix, DVector};
use rustc_hash::FxHashSet;

/// Bundles of junctions at most: the elimination is dense.
const MOST_BUNDLES: usize = 200;
const MOST_STEPS: usize = 120;
/// Rounds of changing the states of corners at most.
const MOST_STATES: usize = 20;
/// Smallest rise of the sources, as a share.
const LEAST_RISE: f64 = 1e-4;

/// Solves the part into `smooth`; says whether that settled.
pub(super) fn solve(
    network: &Network,
    rails: &Rails,
    piece: &Piece,
    solution: &Solution,
    laws: &[Smoothness],
    smooth: &mut Smooth,
) -> bool {
    if !super::general::fits(rails, piece) {
        return false;
    }
    let equations = Equations::new(network, rails, piece);
    if !equations.complete() || equations.bundles.len() > MOST_BUNDLES {
        return false;
    }
    let Some(ports) = Ports::new(network, &equations) else { return false };
    let sheaf = |b: &super::bundle::Bundle| Sheaf::new(network, &b.members, solution, laws);
    let mut newton =
        Newton { ports: &ports, sheaves: equations.bundles.iter().map(sheaf).collect(), solves: 0 };
    let found = newton.answer();
    smooth.solves += newton.solves;
    let Some(a) = found else { return false };
    let x: Vec<Dd> = ports.expand(&a).into_iter().map(Dd::from).collect();
    let floating: FxHashSet<u32> = equations.floating.iter().copied().collect();
    for &n in equations.nodes.iter().filter(|n| !floating.contains(n)) {
        smooth.potentials[n as usize] = equations.potential(&x, n);
    }
    let (v, _) = ports.at(&a);
    for (k, sheaf) in newton.sheaves.iter().enumerate() {
        for (n, curve, _) in &sheaf.curves {
            smooth.junctions[*n as usize] = (v[k], curve.current(v[k]));
        }
    }
    true
}

/// Junctions side by side: smooth ones, and corners with their states.
struct Sheaf {
    /// Branch, law, and where it stands to begin with.
    curves: Vec<(u32, Curve, f64)>,
    corners: Vec<(Junction, Place)>,
}

impl Sheaf {
    fn new(network: &Network, members: &[u32], solution: &Solution, laws: &[Smoothness]) -> Self {
        let mut sheaf = Sheaf { curves: Vec::new(), corners: Vec::new() };
        for &n in members {
            let at = n as usize;
            let (v, i) = (solution.voltages[at].known().unwrap_or(0.0), solution.sample.1[at]);
            match (laws[at], network.branches[at].law) {
                (Smoothness::Curve(curve), _) => {
                    let stands = if i != 0.0 { curve.voltage(i) } else { v };
                    sheaf.curves.push((n, curve, stands));
                }
                (_, Law::Junction(junction)) => sheaf.corners.push((junction, solution.places[at])),
                _ => {}
            }
        }
        sheaf
    }

    /// The level and series resistance of a corner that carries, and its number.
    fn pinned(&self) -> Option<(f64, f64, usize)> {
        self.corners.iter().enumerate().find_map(|(k, (junction, place))| match place {
            Place::Conducting | Place::Open => Some((junction.forward.value, junction.series, k)),
            Place::Breakdown => junction.reverse.map(|r| (-r.value, junction.series, k)),
            _ => None,
        })
    }

    /// Sum of the curves at the points at which each stands.
    fn tangent(&self, points: &[Point]) -> (f64, f64) {
        self.curves.iter().zip(points).fold((0.0, 0.0), |(g, level), ((_, curve, _), p)| {
            let own = p.g.max(curve.least_conductance(p.v));
            (g + own, level + own * p.v - p.i)
        })
    }

    fn current(&self, v: f64) -> f64 {
        self.curves.iter().map(|(_, curve, _)| curve.current(v)).sum()
    }
}

struct Newton<'a> {
    ports: &'a Ports,
    sheaves: Vec<Sheaf>,
    solves: usize,
}

impl Newton<'_> {
    /// The sources behind the junctions at which every law holds.
    fn answer(&mut self) -> Option<DVector<f64>> {
        for _ in 0..MOST_STATES {
            let start = self.points(|stands| stands);
            let a = self.settle(start, 1.0).map(|(a, _)| a).or_else(|| self.raise())?;
            if !self.change_corners(&a) {
                return Some(a);
            }
        }
        None
    }

    fn points(&self, stands: impl Fn(f64) -> f64) -> Vec<Vec<Point>> {
        let of = |sheaf: &Sheaf| sheaf.curves.iter().map(|(_, curve, v)| curve.at(stands(*v))).collect();
        self.sheaves.iter().map(of).collect()
    }

    /// Raises all sources from nothing, in steps that shrink where Newton's method does not follow.
    fn raise(&mut self) -> Option<DVector<f64>> {
        let mut points = self.points(|_| 0.0);
        let (mut share, mut rise) = (0.0, 0.1);
        loop {
            let next = f64::min(share + rise, 1.0);
            match self.settle(points.clone(), next) {
                Some((a, _)) if next == 1.0 => return Some(a),
                Some((_, settled)) => {
                    points = settled;
                    share = next;
                    rise *= 1.5;
                }
                None => rise /= 4.0,
            }
            if rise < LEAST_RISE {
                return None;
            }
        }
    }

    /// Newton's method with all sources at a share of their values.
    fn settle(&mut self, mut points: Vec<Vec<Point>>, share: f64) -> Option<(DVector<f64>, Vec<Vec<Point>>)> {
        let ports = self.ports;
        let count = self.sheaves.len();
        let (v0, i0) = (&ports.v0 * share, &ports.i0 * share);
        for _ in 0..MOST_STEPS {
            let mut matrix = DMatrix::zeros(count, count);
            let mut right = DMatrix::zeros(count, 1);
            for k in 0..count {
                let (alpha, beta, level) = self.law(k, &points[k]);
                matrix.set_row(k, &(ports.v_of_a.row(k) * alpha - ports.i_of_a.row(k) * beta));
                right[(k, 0)] = level - alpha * v0[k] + beta * i0[k];
            }
            self.solves += 1;
            let a: DVector<f64> = solved(&matrix, &right)?.column(0).into_owned();
            let v = &v0 + &ports.v_of_a * &a;
            let mut is_settled = true;
            for (k, sheaf) in self.sheaves.iter().enumerate() {
                for ((_, curve, _), point) in sheaf.curves.iter().zip(&mut points[k]) {
                    let next = limit(curve, point, v[k]);
                    let room = 1e-9 * curve.slope + 1e-14 * v[k].abs();
                    is_settled &= (next - point.v).abs() <= room && (next - v[k]).abs() <= room;
                    *point = curve.at(next);
                }
            }
            if is_settled {
                return Some((a, points));
            }
        }
        None
    }

    /// alpha·v − beta·i = level, in proportions that lose neither.
    fn law(&self, k: usize, points: &[Point]) -> (f64, f64, f64) {
        let sheaf = &self.sheaves[k];
        if let Some((level, series, _)) = sheaf.pinned() {
            return (1.0, series, level);
        }
        let unit = 1.0 / self.ports.rho;
        let (g, level) = sheaf.tangent(points);
        (g / (g + unit), 1.0 / (g + unit), level / (g + unit))
    }

    /// Changes corners whose state does not agree; says whether there were any.
    fn change_corners(&mut self, a: &DVector<f64>) -> bool {
        let (v, i) = self.ports.at(a);
        let rho = self.ports.rho;
        let mut changed = false;
        for (k, sheaf) in self.sheaves.iter_mut().enumerate() {
            let (v, rest) = (v[k], i[k] - sheaf.current(v[k]));
            let room = 1e-9 * (v.abs() + rho * i[k].abs());
            if let Some((level, _, at)) = sheaf.pinned() {
                let sign = if level < 0.0 { -1.0 } else { 1.0 };
                if sign * rest < -room / rho {
                    sheaf.corners[at].1 = Place::Blocking;
                    changed = true;
                }
                continue;
            }
            for (junction, place) in &mut sheaf.corners {
                if v > junction.forward.value + room {
                    *place = Place::Conducting;
                    changed = true;
                } else if junction.reverse.is_some_and(|r| v < -r.value - room) {
                    *place = Place::Breakdown;
                    changed = true;
                }
            }
        }
        changed
    }
}
