//! The interior-point path (Mehrotra 1992; monotone problems: Kojima, Megiddo, Noma & Yoshise 1991) on the same
//! pattern as pivoting: every step is one resistor network, in which each junction is a conductance. Reaches a
//! neighbourhood of a solution of any solvable part in a bounded number of steps, and tends to one in which
//! every junction that can carry current does. Proposes states; `settle` makes them exact.

use super::double_double::Dd;
use super::laplacian::Laplacian;
use super::passive::{Passive, Point, State};
use super::pivoting::{Ease, conductances, pushed};

const STEPS: usize = 60;
/// Mean product of current and slack, as a share of the start's, at which the states are read off.
const CLOSE: f64 = 1e-22;

/// Currents and slacks of both sides of each junction; the reverse side of one that never breaks down is unused.
#[derive(Clone)]
struct Iterate {
    u: Vec<f64>,
    /// `[current, slack]` of the forward, then of the reverse side.
    sides: Vec<[[f64; 2]; 2]>,
}

/// Walks the path and proposes states.
pub(super) fn propose(part: &Passive, system: &mut Laplacian) -> Point {
    let scales = part.scales();
    let amperes = (scales.volts * scales.least.max(scales.most * 1e-6)).max(typical_push(part));
    let mut path = Path {
        part,
        g: conductances(part, system.edges().len()),
        push: pushed(part),
        leak: Ease::of(part).leak,
    };
    let start = [[amperes, scales.volts]; 2];
    let mut x = Iterate { u: vec![0.0; part.nodes], sides: vec![start; part.diodes.len()] };
    let first = path.gap(&x);
    for _ in 0..STEPS {
        let gap = path.gap(&x);
        if gap <= CLOSE * first || !path.step(system, &mut x, gap) {
            break;
        }
    }
    path.read_off(&x, scales.volts, amperes)
}

fn typical_push(part: &Passive) -> f64 {
    part.injected.iter().skip(1).map(|i| i.abs()).fold(0.0, f64::max)
}

struct Path<'a> {
    part: &'a Passive,
    g: Vec<f64>,
    push: Vec<f64>,
    /// The leak keeps potentials that nothing else bounds where the others are.
    leak: Vec<f64>,
}

impl Path<'_> {
    fn active(&self, n: usize) -> usize {
        if self.part.diodes[n].reverse.is_finite() { 2 } else { 1 }
    }

    fn gap(&self, x: &Iterate) -> f64 {
        let (mut sum, mut count) = (0.0, 0usize);
        for (n, sides) in x.sides.iter().enumerate() {
            for [i, s] in &sides[..self.active(n)] {
                sum += i * s;
                count += 1;
            }
        }
        sum / count.max(1) as f64
    }

    fn current(&self, n: usize, sides: &[[f64; 2]; 2]) -> f64 {
        if self.active(n) == 2 { sides[0][0] - sides[1][0] } else { sides[0][0] }
    }

    /// One predictor–corrector step; `false` where it cannot move on.
    fn step(&mut self, system: &mut Laplacian, x: &mut Iterate, gap: f64) -> bool {
        let first_diode = self.part.resistors.len();
        for n in 0..self.part.diodes.len() {
            let a: f64 = x.sides[n][..self.active(n)].iter().map(|[i, s]| i / s).sum();
            self.g[first_diode + n] = a / (1.0 + a * self.part.diodes[n].series) + self.leak[n];
        }
        system.factor(&self.g, false);
        let zero = vec![[0.0; 2]; x.sides.len()];
        let predictor = self.direction(system, x, &zero);
        let reach = self.reach(x, &predictor).min(1.0);
        let ahead = self.moved(x, &predictor, reach);
        let sigma = (self.gap(&ahead) / gap).clamp(0.0, 1.0).powi(3);
        let target: Vec<[f64; 2]> = predictor
            .sides
            .iter()
            .map(|sides| [0, 1].map(|k| sigma * gap - sides[k][0] * sides[k][1]))
            .collect();
        let corrector = self.direction(system, x, &target);
        let step = (0.995 * self.reach(x, &corrector)).min(1.0);
        if !step.is_finite() || step < 1e-12 {
            return false;
        }
        *x = self.moved(x, &corrector, step);
        true
    }

    /// Newton direction towards products `target`.
    fn direction(&self, system: &mut Laplacian, x: &Iterate, target: &[[f64; 2]]) -> Iterate {
        let part = self.part;
        let mut rhs = self.push.clone();
        for (r, g) in part.resistors.iter().zip(&self.g) {
            let i = g * (x.u[r.p as usize] - x.u[r.q as usize]);
            rhs[r.p as usize] -= i;
            rhs[r.q as usize] += i;
        }
        let mut offsets = Vec::with_capacity(part.diodes.len());
        for (n, d) in part.diodes.iter().enumerate() {
            let b = self.offset(n, x, target);
            let a: f64 = x.sides[n][..self.active(n)].iter().map(|[i, s]| i / s).sum();
            let leak = self.leak[n] * (x.u[d.p as usize] - x.u[d.q as usize] + d.delta.round());
            let i = self.current(n, &x.sides[n]) + b / (1.0 + a * d.series) + leak;
            rhs[d.p as usize] -= i;
            rhs[d.q as usize] += i;
            offsets.push((a, b));
        }
        system.solve(&mut rhs);
        let mut sides = Vec::with_capacity(part.diodes.len());
        for (n, d) in part.diodes.iter().enumerate() {
            let (a, b) = offsets[n];
            let dv = rhs[d.p as usize] - rhs[d.q as usize];
            let di = (b + a * dv) / (1.0 + a * d.series);
            let inner = dv - d.series * di;
            let mut moved = [[0.0; 2]; 2];
            for k in 0..self.active(n) {
                let [i, s] = x.sides[n][k];
                let miss = self.miss(n, k, x);
                let sign = if k == 0 { 1.0 } else { -1.0 };
                let ds = miss - sign * inner;
                moved[k] = [(target[n][k] - i * s - i * ds) / s, ds];
            }
            sides.push(moved);
        }
        Iterate { u: rhs, sides }
    }

    /// Current that a diode would add at unchanged voltage.
    fn offset(&self, n: usize, x: &Iterate, target: &[[f64; 2]]) -> f64 {
        let mut sum = 0.0;
        for (k, goal) in target[n].iter().enumerate().take(self.active(n)) {
            let [i, s] = x.sides[n][k];
            let side = (goal - i * s - i * self.miss(n, k, x)) / s;
            sum += if k == 0 { side } else { -side };
        }
        sum
    }

    /// True slack minus kept slack.
    fn miss(&self, n: usize, k: usize, x: &Iterate) -> f64 {
        let d = &self.part.diodes[n];
        let v = x.u[d.p as usize] - x.u[d.q as usize] + d.delta.round();
        let inner = v - d.series * self.current(n, &x.sides[n]);
        let slack = if k == 0 { d.forward - inner } else { d.reverse + inner };
        slack - x.sides[n][k][1]
    }

    /// Longest step that keeps every current and slack positive.
    fn reach(&self, x: &Iterate, by: &Iterate) -> f64 {
        let mut reach = f64::INFINITY;
        for (n, (sides, moves)) in x.sides.iter().zip(&by.sides).enumerate() {
            for (side, change) in sides.iter().zip(moves).take(self.active(n)) {
                for (value, delta) in side.iter().zip(change) {
                    if *delta < 0.0 {
                        reach = reach.min(-value / delta);
                    }
                }
            }
        }
        reach
    }

    fn moved(&self, x: &Iterate, by: &Iterate, step: f64) -> Iterate {
        let u = x.u.iter().zip(&by.u).map(|(a, b)| a + step * b).collect();
        let mut sides = x.sides.clone();
        for (n, (to, change)) in sides.iter_mut().zip(&by.sides).enumerate() {
            for k in 0..self.active(n) {
                to[k] = [to[k][0] + step * change[k][0], to[k][1] + step * change[k][1]];
            }
        }
        Iterate { u, sides }
    }

    fn read_off(&self, x: &Iterate, volts: f64, amperes: f64) -> Point {
        let larger = |[i, s]: [f64; 2]| i * volts > s * amperes;
        let states: Vec<State> = (0..x.sides.len())
            .map(|n| match x.sides[n] {
                [forward, _] if larger(forward) => State::Forward,
                [_, reverse] if self.active(n) == 2 && larger(reverse) => State::Reverse,
                _ => State::Blocking,
            })
            .collect();
        let currents = (0..x.sides.len()).map(|n| self.current(n, &x.sides[n])).collect();
        Point { potentials: x.u.iter().map(|&v| Dd::from(v)).collect(), currents, states }
    }
}
