//! The states that hold: solves exactly for proposed states, checks every assumption, changes those that fail, and
//! solves again.

use super::exact::{NOTHING, Solve};
use super::forest::NONE;
use super::passive::{Diode, Passive, Point, State};

/// Rounds of solve and check.
const ROUNDS: usize = 12;

/// A settled point and what was found on the way.
pub(super) struct Settled {
    pub(super) point: Point,
    /// Diodes of no series resistance whose inner voltage stands at a level within one cluster: their currents may
    /// be open.
    pub(super) tied: bool,
    pub(super) factorizations: usize,
    /// Every assumption holds.
    pub(super) holds: bool,
}

/// What the check says of one diode.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Finding {
    Holds,
    /// It carries nothing: blocking at its corner, which changes nothing else.
    Idle,
    Change(State),
}

/// Solves for the states of `guide`, mends those that fail, and solves again.
pub(super) fn settle(part: &Passive, mut guide: Point) -> Settled {
    let mut factorizations = 0;
    let mut progress = Progress::new(part);
    loop {
        let mut solve = Solve::new(part, &guide);
        let currents = solve.run();
        factorizations += solve.system.factorizations;
        let mut findings = check(&mut solve, &currents);
        mend_loops(&solve, &currents, &mut findings);
        let leaks = let_out(&solve, &mut findings);
        let failing = findings.iter().filter(|f| matches!(f, Finding::Change(_))).count();
        let idle = failing == 0 && findings.contains(&Finding::Idle);
        let tied = solve.tied(findings.len());
        let potentials = std::mem::take(&mut solve.potentials);
        drop(solve);
        guide = Point { potentials, currents, states: guide.states };
        if failing == 0 && !idle {
            return Settled { point: guide, tied, factorizations, holds: !leaks };
        }
        if !progress.go_on(failing, idle) {
            return Settled { point: guide, tied, factorizations, holds: false };
        }
        apply(&mut guide.states, &findings, idle, progress.one_by_one());
    }
}

/// Changes the states that fail: all of them, or the first (Murty 1974).
fn apply(states: &mut [State], findings: &[Finding], idle: bool, one_by_one: bool) {
    for (state, finding) in states.iter_mut().zip(findings) {
        match finding {
            Finding::Change(new) => {
                *state = *new;
                if one_by_one {
                    return;
                }
            }
            Finding::Idle if idle => *state = State::Blocking,
            _ => {}
        }
    }
}

/// Counts rounds, and says how to go on.
struct Progress {
    least: usize,
    stuck: usize,
    rounds: usize,
    most: usize,
}

impl Progress {
    fn new(part: &Passive) -> Self {
        // small parts can afford the method that changes one state at a time
        let most = if part.nodes > 500 { ROUNDS } else { ROUNDS + 8 * part.diodes.len() };
        Progress { least: usize::MAX, stuck: 0, rounds: 0, most }
    }

    fn go_on(&mut self, failing: usize, idle: bool) -> bool {
        self.rounds += 1;
        if !idle {
            self.stuck = if failing < self.least { 0 } else { self.stuck + 1 };
            self.least = self.least.min(failing);
        }
        self.rounds < self.most
    }

    fn one_by_one(&self) -> bool {
        self.stuck > 3
    }
}

/// What each diode's assumption is worth at this point.
fn check(solve: &mut Solve<'_>, currents: &[f64]) -> Vec<Finding> {
    let small = nothing_of(solve, currents);
    let diodes = solve.part.diodes.iter().zip(&solve.guide.states).zip(currents).zip(&small);
    diodes
        .map(|(((d, &state), &i), &small)| {
            let v = solve.part.across(d, &solve.potentials);
            let room = NOTHING * solve.scale(d);
            judge(d, state, (v - (d.series * i).into()).round(), i, room, small)
        })
        .collect()
}

/// Where an island gets current that nothing lets out, the junction that is nearest to doing so will. Whether there
/// was such an island.
fn let_out(solve: &Solve<'_>, findings: &mut [Finding]) -> bool {
    let Some((island, gains)) = solve.leaking() else { return false };
    let mut nearest = vec![(f64::INFINITY, 0usize, State::Blocking); gains.len()];
    for (n, d) in solve.part.diodes.iter().enumerate() {
        let (p, q) = (island[d.p as usize] as usize, island[d.q as usize] as usize);
        if p == q || solve.guide.states[n] != State::Blocking {
            continue;
        }
        let v = solve.part.across(d, &solve.potentials).round();
        for (slack, state, from, to) in
            [(d.forward - v, State::Forward, p, q), (d.reverse + v, State::Reverse, q, p)]
        {
            for at in [from, to] {
                let helps = if at == from { gains[at] > 0.0 } else { gains[at] < 0.0 };
                if helps && slack < nearest[at].0 {
                    nearest[at] = (slack, n, state);
                }
            }
        }
    }
    for (slack, n, state) in nearest {
        if slack.is_finite() {
            findings[n] = Finding::Change(state);
        }
    }
    true
}

/// A junction that closes a loop of others and would carry more than its level allows drives current around that
/// loop: the junction whose current that uses up first gives way.
fn mend_loops(solve: &Solve<'_>, currents: &[f64], findings: &mut [Finding]) {
    for &chord in &solve.forest.chords {
        let diode = solve.tie_diode[chord as usize] as usize;
        let d = &solve.part.diodes[diode];
        let Some(level) = d.level(solve.guide.states[diode]) else { continue };
        let v = solve.part.across(d, &solve.potentials).round();
        let room = NOTHING * solve.scale(d);
        if (v - level).abs() <= room || matches!(findings[diode], Finding::Change(_)) {
            continue;
        }
        let tie = &solve.ties[chord as usize];
        let (from, to) = if v > level { (tie.b, tie.a) } else { (tie.a, tie.b) };
        let yields = solve.forest.walk(&solve.ties, from, to).into_iter().filter_map(|(t, sign)| {
            let other = solve.tie_diode[t as usize] as usize;
            let shrinks = match solve.guide.states[other] {
                State::Forward => sign < 0.0,
                State::Reverse => sign > 0.0,
                State::Blocking => false,
            };
            shrinks.then_some((other, currents[other].abs()))
        });
        if let Some((other, _)) = yields.min_by(|a, b| a.1.total_cmp(&b.1)) {
            findings[other] = Finding::Change(State::Blocking);
        }
    }
}

/// Current that counts as nothing in each diode: what its voltage, moved by its own rounding, would change. Only currents that could be that small are asked for it.
fn nothing_of(solve: &mut Solve<'_>, currents: &[f64]) -> Vec<f64> {
    let mut small = vec![0.0; currents.len()];
    let pushed = solve.part.injected.iter().skip(1).map(|i| i.abs()).fold(0.0, f64::max);
    let mut whole = vec![0.0; solve.forest.groups];
    for (&group, &gross) in solve.forest.group.iter().zip(&solve.gross) {
        whole[group as usize] = f64::max(whole[group as usize], gross);
    }
    let conducts =
        solve.part.resistors.iter().map(|r| r.ohms).chain(solve.part.diodes.iter().map(|d| d.series));
    let conducts: f64 = conducts.filter(|&r| r > 0.0).map(|r| 1.0 / r).sum();
    for node in 0..solve.part.nodes as u32 {
        let tie = solve.forest.up[node as usize];
        if tie == NONE {
            continue;
        }
        let diode = solve.tie_diode[tie as usize] as usize;
        let i = currents[diode].abs();
        let coarse = NOTHING * whole[solve.forest.group[node as usize] as usize];
        let d = &solve.part.diodes[diode];
        let room = NOTHING * solve.scale(d);
        small[diode] = if i > coarse.max(room * conducts) || i == 0.0 {
            0.0
        } else {
            (room * solve.response(node)).max(1e-15 * pushed).max(1e-12 * coarse)
        };
    }
    for (n, d) in solve.part.diodes.iter().enumerate().filter(|(_, d)| d.series > 0.0) {
        let room = NOTHING * solve.scale(d);
        let suspect = solve.guide.states[n] != State::Blocking && currents[n].abs() <= room / d.series;
        small[n] = if suspect { (room * solve.link_response(d)).max(NOTHING * room / d.series) } else { 0.0 };
    }
    small
}

/// What the assumption `state` is worth with inner voltage `v` and current `i`; below `room` and `small` voltage and
/// current are nothing.
fn judge(d: &Diode, state: State, v: f64, i: f64, room: f64, small: f64) -> Finding {
    match state {
        // a junction that closes a loop of others stands where they put it
        State::Forward if v < d.forward - room => Finding::Change(State::Blocking),
        State::Reverse if v > -d.reverse + room => Finding::Change(State::Blocking),
        State::Forward if i < -small => Finding::Change(State::Blocking),
        State::Reverse if i > small => Finding::Change(State::Blocking),
        State::Forward if i <= small => Finding::Idle,
        State::Reverse if i >= -small => Finding::Idle,
        State::Blocking if v > d.forward + room => Finding::Change(State::Forward),
        State::Blocking if v < -d.reverse - room => Finding::Change(State::Reverse),
        _ => Finding::Holds,
    }
}
