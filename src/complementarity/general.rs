//! Parts with controlled laws or negative resistances. Such parts may have several consistent sets of states, or
//! none: the linear rest is reduced to what its junctions see, and every set of states is tried where there are
//! few enough.

use super::bundle::Bundle;
use super::double_double::Dd;
use super::equations::Equations;
use super::network::{Law, Network};
use super::outcome::{Interval, Place, Quantity, Reason, Solution, Verdict, View};
use super::parts::Piece;
use super::ports::{Ports, Trial};
use super::rails::Rails;
use super::solve::Answer;
use rustc_hash::FxHashSet;

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

impl Set {
    /// Shares out what the first of a bundle carries for all of them.
    fn share(&mut self, bundle: &Bundle, place: Place) {
        let leader = bundle.members[0];
        let carriers = bundle.carriers(place);
        for &n in &bundle.members {
            self.places.push((n, if carriers.contains(&n) { place } else { Place::Blocking }));
        }
        if carriers.is_empty() || carriers == [leader] {
            return;
        }
        let whole = self.currents.iter().find(|(n, _)| *n == leader).map_or(0.0, |&(_, i)| i);
        let open = self.ranges.iter().find(|(n, _)| *n == leader).map(|&(_, range)| range);
        self.ranges.retain(|(n, _)| *n != leader);
        let share = whole / carriers.len() as f64;
        for (n, i) in self.currents.iter_mut().filter(|(n, _)| bundle.members.contains(n)) {
            *i = if carriers.contains(n) { share } else { 0.0 };
        }
        let most = open.unwrap_or(Interval { low: whole, high: whole });
        let range = Interval { low: most.low.min(0.0), high: most.high.max(0.0) };
        match &carriers[..] {
            [one] => self.ranges.extend(open.map(|range| (*one, range))),
            _ => self.ranges.extend(carriers.iter().map(|&n| (n, range))),
        }
    }
}

/// Unknowns at most.
const MOST_UNKNOWNS: usize = 200_000;

pub(super) fn fits(rails: &Rails, piece: &Piece) -> bool {
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
    let equations = Equations::new(network, rails, &answer.piece);
    answer.solves += 1;
    if !equations.complete() {
        answer.verdict = Verdict::Unverified;
        let text = "a controlled source listens to a current that the laws leave open".into();
        answer.reasons.push(Reason::Dependent { text });
        return;
    }
    let Some(ports) = Ports::new(network, &equations) else {
        whole(network, &equations, answer);
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
        sets.map(|t| super::solve::Found::General(set_of_trial(network, &equations, &ports, t))).collect();
}

/// A part whose linear rest has no answer of its own, every combination of states solved whole.
fn whole(network: &Network, equations: &Equations<'_>, answer: &mut Answer) {
    let Some(found) = super::full::enumerate(equations) else {
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
        let currents = one.x[equations.nodes.len()..].iter().fold(0.0, |m: f64, i| m.max(i.abs()));
        let x: Vec<Dd> = one.x.iter().map(|&x| x.into()).collect();
        let set = set(network, equations, &x, 1e-13 * currents, &one.places, &[]);
        answer.found.push(super::solve::Found::General(set));
    }
}

fn set_of_trial(network: &Network, equations: &Equations<'_>, ports: &Ports, trial: &Trial) -> Set {
    let exact = trial.open.is_empty().then(|| super::full::exactly(equations, &trial.places)).flatten();
    let (x, rounding) = match exact {
        Some(x) => {
            let largest = x[equations.nodes.len()..].iter().fold(0.0, |m: f64, i| m.max(i.abs()));
            let terms = equations.largest_term(&x);
            (x, (EXACT * largest).max(EXACT_TERM * terms))
        }
        None => {
            let x = ports.expand(&trial.currents).into_iter().map(Dd::from).collect();
            (x, ports.rounding(&trial.currents))
        }
    };
    let moved: Vec<(Vec<f64>, Interval)> =
        trial.open.iter().map(|(direction, room)| (ports.expand_change(direction), *room)).collect();
    set(network, equations, &x, rounding, &trial.places, &moved)
}

/// A point of a part, and how it may move, in the numbers of the network.
fn set(
    network: &Network,
    equations: &Equations<'_>,
    x: &[Dd],
    rounding: f64,
    places: &[Place],
    moved: &[(Vec<f64>, Interval)],
) -> Set {
    let mut set = Set {
        potentials: equations.nodes.iter().map(|&n| (n, equations.potential(x, n))).collect(),
        currents: Vec::new(),
        voltages: Vec::new(),
        places: Vec::new(),
        rooms: equations.floating.iter().map(|&n| (n, ANYWHERE)).collect(),
        ranges: Vec::new(),
    };
    let floating: FxHashSet<u32> = equations.floating.iter().copied().collect();
    for (change, room) in moved {
        for &n in equations.nodes.iter().filter(|n| !floating.contains(n)) {
            if let Some(interval) = scaled(equations.potential_change(change, n), *room) {
                set.rooms.push((n, interval));
            }
        }
    }
    for &n in &equations.branches {
        let b = &network.branches[n as usize];
        let (v, i) = (equations.voltage(x, b.from, b.to), equations.current(network, x, n));
        let i = if i.abs() <= rounding && !matches!(b.law, Law::Current(_)) { 0.0 } else { i };
        if !matches!(b.law, Law::Voltage(_) | Law::Short) {
            set.currents.push((n, i));
        }
        let mut voltage = Quantity::Known(v);
        for (change, room) in moved {
            let slope = equations.voltage_change(change, b.from, b.to);
            if let Some(by) = scaled(slope, *room) {
                voltage = Quantity::Open(Interval { low: v + by.low, high: v + by.high });
            }
            if let Some(by) = scaled(equations.current_change(network, change, n), *room) {
                set.ranges.push((n, snapped(Interval { low: i + by.low, high: i + by.high })));
            }
        }
        set.voltages.push((n, voltage));
    }
    for (bundle, &place) in equations.bundles.iter().zip(places) {
        set.share(bundle, place);
    }
    set
}

/// Ends that are zero but for rounding are zero.
fn snapped(range: Interval) -> Interval {
    let size =
        [range.low, range.high].into_iter().filter(|x| x.is_finite()).fold(0.0, |m: f64, x| m.max(x.abs()));
    let snap = |x: f64| if x.abs() <= 1e-11 * size { 0.0 } else { x };
    Interval { low: snap(range.low), high: snap(range.high) }
}

/// Share of the largest current that is rounding where a solution has twice the digits.
const EXACT: f64 = 1e-22;

/// Share of the largest term of Ohm's law that is rounding there: where all currents of a part are 0, only such terms
/// say what a current is.
const EXACT_TERM: f64 = 1e-26;

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
    let equations = Equations::new(network, rails, piece);
    let Some(ports) = Ports::new(network, &equations) else { return };
    let places: Vec<Place> = equations.bundles.iter().map(|b| together(b, solution)).collect();
    let seen = ports.views(&places);
    for ((bundle, &place), view) in equations.bundles.iter().zip(&places).zip(seen) {
        let carriers = bundle.carriers(place);
        for &n in bundle.members.iter().filter(|n| wanted[**n as usize]) {
            let (i, v) = (solution.currents[n as usize].known(), solution.voltages[n as usize].known());
            let (Some(_), Some(v)) = (i, v) else { continue };
            views[n as usize] = if carriers.is_empty() || carriers == [n] {
                view
            } else {
                // another one beside it holds its voltage
                Some(View { open_circuit: v, resistance: 0.0 })
            };
        }
    }
}

/// The place of a bundle: that of a member that carries current.
pub(super) fn together(bundle: &Bundle, solution: &Solution) -> Place {
    let places = bundle.members.iter().map(|&n| solution.places[n as usize]);
    places.into_iter().find(|&p| p != Place::Blocking).unwrap_or(Place::Blocking)
}
