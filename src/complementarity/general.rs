//! Parts with controlled laws or negative resistances. Such parts may have several consistent sets of states, or
//! none: the linear rest is reduced to what its junctions see, and every set of states is tried where there are
//! few enough.

use super::dense::Dense;
use super::network::{Law, Network};
use super::outcome::{Interval, Place, Quantity, Reason, Solution, Verdict, View};
use super::parts::Piece;
use super::ports::{Ports, Trial};
use super::rails::Rails;
use super::solve::Answer;

/// One consistent set of a part.
pub(super) struct Set {
    potentials: Vec<(u32, f64)>,
    currents: Vec<(u32, f64)>,
    places: Vec<(u32, Place)>,
    voltages: Vec<(u32, Quantity)>,
    /// Open quantities: nodes move by these rooms, branches have these ranges.
    rooms: Vec<(u32, Interval)>,
    ranges: Vec<(u32, Interval)>,
}

impl Set {
    pub(super) fn fill(&self, potentials: &mut [f64], currents: &mut [f64]) {
        for &(n, v) in &self.potentials {
            potentials[n as usize] = v;
        }
        for &(n, i) in &self.currents {
            currents[n as usize] = i;
        }
    }

    /// Whether currents, and whether potentials are open.
    pub(super) fn fill_open(
        &self,
        room: &mut [Interval],
        ranges: &mut [Option<Interval>],
        places: &mut [Place],
        voltages: &mut [Quantity],
    ) -> (bool, bool) {
        for &(n, v) in self.voltages.iter().filter(|(_, v)| v.known().is_none_or(f64::is_finite)) {
            voltages[n as usize] = v;
        }
        for &(n, interval) in &self.rooms {
            room[n as usize] = interval;
        }
        for &(n, interval) in &self.ranges {
            ranges[n as usize] = Some(interval);
        }
        for &(n, place) in &self.places {
            places[n as usize] = place;
        }
        (!self.ranges.is_empty(), !self.rooms.is_empty())
    }
}

/// Unknowns at most: the elimination is dense.
const MOST_UNKNOWNS: usize = 1500;

fn fits(rails: &Rails, piece: &Piece) -> bool {
    let nodes: usize = piece.groups.iter().map(|&g| rails.nodes_of(g).len()).sum();
    nodes <= MOST_UNKNOWNS
}

/// All consistent sets of one part.
pub(super) fn solve(network: &Network, rails: &Rails, answer: &mut Answer) {
    if !fits(rails, &answer.piece) {
        answer.verdict = Verdict::Unverified;
        let text = format!("this part joins more than {MOST_UNKNOWNS} unknowns to controlled sources");
        answer.reasons.push(Reason::Dependent { text });
        return;
    }
    let dense = Dense::new(network, rails, &answer.piece);
    answer.solves += 1;
    if !dense.complete() {
        answer.verdict = Verdict::Unverified;
        let text = "a controlled source listens to a current that the laws leave open".into();
        answer.reasons.push(Reason::Dependent { text });
        return;
    }
    let Some(ports) = Ports::new(network, &dense) else {
        whole(network, &dense, answer);
        return;
    };
    let (trials, complete) = ports.consistent();
    answer.truncated = !complete || trials.len() > super::assemble::MOST_SETS;
    answer.verdict = match trials.len() {
        0 if complete => Verdict::None,
        0 => Verdict::Unverified,
        1 if complete => Verdict::Unique,
        _ => Verdict::Several,
    };
    if !complete {
        let text = "there are too many combinations of states to try them all: more sets may exist".into();
        answer.reasons.push(Reason::Dependent { text });
    } else if trials.is_empty() {
        let text = "no combination of states of its diodes is consistent".into();
        answer.reasons.push(Reason::Dependent { text });
    }
    let sets = trials.iter().take(super::assemble::MOST_SETS);
    answer.found =
        sets.map(|t| super::solve::Found::General(set_of_trial(network, &dense, &ports, t))).collect();
}

/// A part whose linear rest has no answer of its own, every combination of states solved whole.
fn whole(network: &Network, dense: &Dense<'_>, answer: &mut Answer) {
    let Some(found) = super::full::enumerate(network, dense) else {
        answer.verdict = Verdict::Unverified;
        let text = "the controlled sources leave the circuit without a unique answer".into();
        answer.reasons.push(Reason::Dependent { text });
        return;
    };
    answer.verdict = match found.len() {
        0 => Verdict::None,
        1 => Verdict::Unique,
        _ => Verdict::Several,
    };
    if found.is_empty() {
        let text = "no combination of states of its diodes is consistent with the controlled sources".into();
        answer.reasons.push(Reason::Dependent { text });
    }
    answer.truncated = found.len() > super::assemble::MOST_SETS;
    for one in found.iter().take(super::assemble::MOST_SETS) {
        let currents = one.x[dense.nodes.len()..].iter().fold(0.0, |m: f64, i| m.max(i.abs()));
        let places = one.places.iter().zip(&dense.junctions).map(|(&p, &n)| (n, p)).collect();
        let set = set(network, dense, &one.x, 1e-13 * currents, places, &[]);
        answer.found.push(super::solve::Found::General(set));
    }
}

fn set_of_trial(network: &Network, dense: &Dense<'_>, ports: &Ports, trial: &Trial) -> Set {
    let x = ports.expand(&trial.currents);
    let moved: Vec<(Vec<f64>, Interval)> =
        trial.open.iter().map(|(direction, room)| (ports.expand_change(direction), *room)).collect();
    let places = trial.places.iter().zip(&ports.junctions).map(|(&p, &n)| (n, p)).collect();
    set(network, dense, &x, ports.rounding(&trial.currents), places, &moved)
}

/// A point of a part, and how it may move, in the numbers of the network.
fn set(
    network: &Network,
    dense: &Dense<'_>,
    x: &[f64],
    rounding: f64,
    places: Vec<(u32, Place)>,
    moved: &[(Vec<f64>, Interval)],
) -> Set {
    let mut set = Set {
        potentials: dense.nodes.iter().map(|&n| (n, dense.potential(x, n))).collect(),
        currents: Vec::new(),
        voltages: Vec::new(),
        places,
        rooms: dense.floating.iter().map(|&n| (n, ANYWHERE)).collect(),
        ranges: Vec::new(),
    };
    for (change, room) in moved {
        for &n in dense.nodes.iter().filter(|n| !dense.floating.contains(n)) {
            if let Some(interval) = scaled(dense.potential_change(change, n), *room) {
                set.rooms.push((n, interval));
            }
        }
    }
    for &n in &dense.branches {
        let b = &network.branches[n as usize];
        let (v, i) = (dense.voltage(x, b.from, b.to), dense.current(network, x, n));
        let i = if i.abs() <= rounding && !matches!(b.law, Law::Current(_)) { 0.0 } else { i };
        if !matches!(b.law, Law::Voltage(_) | Law::Short) {
            set.currents.push((n, i));
        }
        let mut voltage = Quantity::Known(v);
        for (change, room) in moved {
            let slope = dense.voltage_change(change, b.from, b.to);
            if let Some(by) = scaled(slope, *room) {
                voltage = Quantity::Open(Interval { low: v + by.low, high: v + by.high });
            }
            if let Some(by) = scaled(dense.current_change(network, change, n), *room) {
                set.ranges.push((n, Interval { low: i + by.low, high: i + by.high }));
            }
        }
        set.voltages.push((n, voltage));
    }
    set
}

const ANYWHERE: Interval = Interval { low: f64::NEG_INFINITY, high: f64::INFINITY };

fn scaled(slope: f64, room: Interval) -> Option<Interval> {
    if slope.abs() <= 1e-12 {
        return None;
    }
    let (a, b) = (slope * room.low, slope * room.high);
    Some(Interval { low: a.min(b), high: a.max(b) })
}

/// Views in such a part: each junction's own row of what the junctions see.
pub(super) fn views(
    network: &Network,
    rails: &Rails,
    piece: &Piece,
    solution: &Solution,
    wanted: &[bool],
    views: &mut [Option<View>],
) {
    if !fits(rails, piece) {
        return;
    }
    let dense = Dense::new(network, rails, piece);
    let Some(ports) = Ports::new(network, &dense) else { return };
    let places: Vec<Place> = ports.junctions.iter().map(|&n| solution.places[n as usize]).collect();
    for (k, &n) in ports.junctions.iter().enumerate().filter(|(_, n)| wanted[**n as usize]) {
        let (i, v) = (solution.currents[n as usize], solution.voltages[n as usize]);
        if i.known().is_some() && v.known().is_some() {
            views[n as usize] = ports.view(k, &places);
        }
    }
}
