//! Assumed states by block principal pivoting (Portugal, Júdice & Vicente 1994) on a network in which every
//! junction has a tiny series resistance and a tiny leak, so that any set of assumptions has one answer. The
//! answer only proposes states; `settle` solves without resistance and leak.

use super::double_double::Dd;
use super::forest::Adjacency;
use super::laplacian::Laplacian;
use super::passive::{Diode, Passive, Point, State};

/// Rounds without progress after which the interior-point path takes over.
const PATIENCE: usize = 3;
/// Rounds at most: a falling count may fall slowly on long chains.
const ROUNDS: usize = 24;

/// Share of the conductance around a junction that its leak has, and inversely its resistance: small enough to
/// leave the states alone, large enough that currents can be told from rounding. In large parts plain double
/// precision must carry the spread.
const SMALL: f64 = 1e-8;
const SMALL_IN_LARGE: f64 = 1e-6;

/// Small numbers of the eased network, for each diode: resistance while conducting, leak while blocking.
pub(super) struct Ease {
    series: Vec<f64>,
    pub(super) leak: Vec<f64>,
    /// Voltage that leaks may account for: what is closer to its level is left to the exact solve.
    doubt: f64,
}

impl Ease {
    pub(super) fn of(part: &Passive) -> Self {
        let around = around(part);
        let small = if part.is_large() { SMALL_IN_LARGE } else { SMALL };
        let least = |d: &Diode| match (d.p, d.q) {
            (0, n) | (n, 0) => around[n as usize],
            (p, q) => around[p as usize].min(around[q as usize]),
        };
        Ease {
            series: part.diodes.iter().map(|d| small / least(d)).collect(),
            leak: part.diodes.iter().map(|d| small * least(d)).collect(),
            doubt: 10.0 * small * part.scales().volts,
        }
    }
}

/// Conductance that meets at each group; groups with none take that of the nearest group that has some.
fn around(part: &Passive) -> Vec<f64> {
    let mut around = vec![0.0; part.nodes];
    for r in part.resistors.iter().filter(|r| r.p != r.q) {
        around[r.p as usize] += 1.0 / r.ohms;
        around[r.q as usize] += 1.0 / r.ohms;
    }
    around[0] = 0.0;
    let mut queue: std::collections::VecDeque<u32> =
        (1..part.nodes as u32).filter(|&n| around[n as usize] > 0.0).collect();
    if queue.len() + 1 < part.nodes {
        let near = Adjacency::new(part.nodes, part.diodes.iter().map(|d| (d.p, d.q)));
        while let Some(node) = queue.pop_front() {
            for &(_, other) in near.of(node).iter().filter(|(_, other)| *other != 0) {
                if around[other as usize] == 0.0 {
                    around[other as usize] = around[node as usize];
                    queue.push_back(other);
                }
            }
        }
        let scales = part.scales();
        let rest = if scales.pushed > 0.0 { scales.pushed / scales.volts } else { scales.most };
        around.iter_mut().filter(|g| **g == 0.0).for_each(|g| *g = rest);
    }
    around
}

/// Pattern of the eased network: resistors, diodes, one pin for each island.
pub(super) fn pattern(part: &Passive) -> Laplacian {
    let mut edges: Vec<(u32, u32)> = part.pairs().collect();
    edges.extend(part.islands().into_iter().map(|n| (n, 0)));
    Laplacian::new(part.nodes, edges)
}

/// Conductances of resistors, then room for diodes, then pins.
pub(super) fn conductances(part: &Passive, edges: usize) -> Vec<f64> {
    let mut g: Vec<f64> = part.resistors.iter().map(|r| 1.0 / r.ohms).collect();
    g.resize(edges, part.scales().least);
    g
}

/// Currents that sources push into each group, fixed voltages across resistors counted as such.
pub(super) fn pushed(part: &Passive) -> Vec<f64> {
    let mut push: Vec<Dd> = part.injected.clone();
    for r in &part.resistors {
        let i = r.delta.over(r.ohms);
        push[r.p as usize] += -i;
        push[r.q as usize] += i;
    }
    push.into_iter().map(Dd::round).collect()
}

/// Proposes states; `None` where pivoting makes no progress.
pub(super) fn propose(part: &Passive, system: &mut Laplacian) -> Option<Point> {
    let ease = Ease::of(part);
    let mut g = conductances(part, system.edges().len());
    let push = pushed(part);
    let mut states = vec![State::Forward; part.diodes.len()];
    let (mut best, mut idle) = (usize::MAX, 0);
    for _ in 0..ROUNDS {
        let mut u = push.clone();
        for (n, (diode, &state)) in part.diodes.iter().zip(&states).enumerate() {
            let (conductance, level) = eased(&ease, n, diode, state);
            g[part.resistors.len() + n] = conductance;
            let i = (diode.delta.round() - level) * conductance;
            u[diode.p as usize] -= i;
            u[diode.q as usize] += i;
        }
        system.factor(&g, !part.is_large());
        system.solve(&mut u);
        let (changed, currents) = review(part, &ease, &u, &mut states);
        if changed == 0 {
            let potentials = u.into_iter().map(Dd::from).collect();
            return Some(Point { potentials, currents, states });
        }
        if changed < best {
            (best, idle) = (changed, 0);
        } else {
            idle += 1;
            if idle > PATIENCE {
                return None;
            }
        }
    }
    None
}

/// Conductance of eased diode `n` and the voltage it opposes.
fn eased(ease: &Ease, n: usize, diode: &Diode, state: State) -> (f64, f64) {
    match diode.level(state) {
        Some(level) => (1.0 / (diode.series + ease.series[n]), level),
        None => (ease.leak[n], 0.0),
    }
}

/// Checks every assumption and changes those that fail.
fn review(part: &Passive, ease: &Ease, u: &[f64], states: &mut [State]) -> (usize, Vec<f64>) {
    let mut changed = 0;
    let mut currents = Vec::with_capacity(states.len());
    for (n, (diode, state)) in part.diodes.iter().zip(states).enumerate() {
        let (up, uq, delta) = (u[diode.p as usize], u[diode.q as usize], diode.delta.round());
        let v = up - uq + delta;
        let room = 4.0 * f64::EPSILON * (up.abs() + uq.abs() + delta.abs() + diode.forward);
        let next = match *state {
            State::Forward if v < diode.forward - room => State::Blocking,
            State::Reverse if v > -diode.reverse + room => State::Blocking,
            State::Blocking if v > diode.forward + room + ease.doubt => State::Forward,
            State::Blocking if v < -diode.reverse - room - ease.doubt => State::Reverse,
            same => same,
        };
        let (g, level) = eased(ease, n, diode, *state);
        currents.push(if *state == State::Blocking { 0.0 } else { (v - level) * g });
        if next != *state {
            *state = next;
            changed += 1;
        }
    }
    (changed, currents)
}
