//! Puts the answers of the parts together: potentials, currents of sources by Kirchhoff's law, open intervals,
//! and the list of consistent sets.

use super::exact::at_level;
use super::idle::cancel_idle;
use super::network::{Law, Network};
use super::openness::{Arc, current_ranges};
use super::outcome::{Interval, Outcome, Part, Place, Quantity, Solution, Verdict};
use super::parts::Built;
use super::passive::{Point, State};
use super::potentials::{Potentials, is_point, potentials};
use super::rails::{Rails, fixed};
use super::solve::{Answer, Found};
use super::tie_currents::tie_currents;

/// Consistent sets listed at most.
pub(super) const MOST_SETS: usize = 16;

pub(super) struct Assembly<'a> {
    network: &'a Network,
    rails: &'a Rails,
    answers: Vec<Answer>,
}

/// Values of one set while it is put together; NaN where not evaluated.
struct Sheet {
    potentials: Vec<f64>,
    currents: Vec<f64>,
    /// How far each node's potential may move.
    room: Vec<Interval>,
    /// Open currents.
    ranges: Vec<Option<Interval>>,
    voltages: Vec<Quantity>,
    places: Vec<Place>,
}

const STILL: Interval = Interval { low: 0.0, high: 0.0 };
/// Whatever is not known of such a current, it may be anything.
const ANY: Interval = Interval { low: f64::NEG_INFINITY, high: f64::INFINITY };

impl<'a> Assembly<'a> {
    pub(super) fn new(network: &'a Network, rails: &'a Rails, answers: Vec<Answer>) -> Self {
        Assembly { network, rails, answers }
    }

    pub(super) fn outcome(mut self) -> Outcome {
        let solves = self.answers.iter().map(|a| a.solves).sum();
        let (picks, cut_off) = self.picks();
        let mut solutions = Vec::new();
        for (k, pick) in picks.iter().enumerate() {
            let solution = self.solution(pick, k == 0);
            solutions.push(solution);
        }
        let mut parts: Vec<Part> = self.rails.contradictions.clone();
        parts.extend(self.answers.iter().map(|a| a.part(self.rails)));
        let truncated = cut_off || parts.iter().any(|p| p.truncated);
        let verdict = most_serious(parts.iter().map(|p| p.verdict));
        let nothing = self.answers.iter().all(|a| a.found.is_empty())
            && parts.iter().any(|p| p.verdict >= Verdict::Partial);
        if nothing && !self.rails_known() {
            solutions.clear();
        }
        Outcome { verdict, parts, solutions, truncated, solves }
    }

    /// Some node is known from sources alone.
    fn rails_known(&self) -> bool {
        let known = |n: &u32| *n != 0 && !self.rails.tainted[*n as usize];
        self.rails.nodes_of(0).iter().any(known)
    }

    /// Which set of each answer makes up each solution.
    fn picks(&self) -> (Vec<Vec<usize>>, bool) {
        let mut picks = vec![vec![0; self.answers.len()]];
        let mut cut_off = false;
        for (n, answer) in self.answers.iter().enumerate().filter(|(_, a)| a.found.len() > 1) {
            let mut more = Vec::new();
            for pick in &picks {
                for set in 0..answer.found.len() {
                    let mut pick = pick.clone();
                    pick[n] = set;
                    more.push(pick);
                }
            }
            cut_off |= more.len() > MOST_SETS;
            more.truncate(MOST_SETS);
            picks = more;
        }
        (picks, cut_off)
    }

    fn solution(&mut self, pick: &[usize], first: bool) -> Solution {
        let mut sheet = self.blank();
        self.fill_samples(pick, &mut sheet);
        tie_currents(self.network, self.rails, &mut sheet.currents);
        self.fill_ranges(pick, &mut sheet);
        let mut shared = self.shared_answers(&sheet);
        let mut floating = vec![false; self.answers.len()];
        for (n, &set) in pick.iter().enumerate() {
            floating[n] = self.fill_room(n, set, &mut sheet);
        }
        self.fill_general(pick, &mut sheet, &mut shared, &mut floating);
        self.fill_voltages(&mut sheet);
        if first {
            self.note_openness(&shared, &floating, &sheet);
        }
        self.finish(sheet)
    }

    fn blank(&self) -> Sheet {
        let (nodes, branches) = (self.rails.tainted.len(), self.network.branches.len());
        Sheet {
            potentials: vec![f64::NAN; nodes],
            currents: vec![f64::NAN; branches],
            room: vec![STILL; nodes],
            ranges: vec![None; branches],
            voltages: vec![Quantity::Unknown; branches],
            places: vec![Place::Unknown; branches],
        }
    }

    fn fill_samples(&self, pick: &[usize], sheet: &mut Sheet) {
        for &node in self.rails.nodes_of(0) {
            if !self.rails.tainted[node as usize] {
                sheet.potentials[node as usize] = self.rails.forest.offset[node as usize].round();
            }
        }
        for (n, b) in self.network.branches.iter().enumerate() {
            if let Law::Current(level) = b.law {
                sheet.currents[n] = level.value;
            }
        }
        for (answer, &set) in self.answers.iter().zip(pick) {
            match answer.found.get(set) {
                Some(Found::Passive { built, point, .. }) => self.fill_passive(answer, built, point, sheet),
                Some(Found::General(set)) => set.fill(&mut sheet.potentials, &mut sheet.currents),
                None => {}
            }
        }
    }

    fn fill_passive(&self, answer: &Answer, built: &Built, point: &Point, sheet: &mut Sheet) {
        for (n, &group) in answer.piece.groups.iter().enumerate() {
            for &node in self.rails.nodes_of(group) {
                let u = point.potentials[n + 1] + self.rails.forest.offset[node as usize];
                sheet.potentials[node as usize] = u.round();
            }
        }
        let volts = built.part.scales().volts;
        for (r, &branch) in built.part.resistors.iter().zip(&built.resistors) {
            sheet.currents[branch as usize] = built.part.current(r, &point.potentials, volts);
        }
        for ((&i, &state), &branch) in point.currents.iter().zip(&point.states).zip(&built.diodes) {
            sheet.currents[branch as usize] = if state == State::Blocking { 0.0 } else { i };
            sheet.places[branch as usize] = match state {
                State::Forward => Place::Conducting,
                State::Blocking => Place::Blocking,
                State::Reverse => Place::Breakdown,
            };
        }
    }

    fn fill_ranges(&self, pick: &[usize], sheet: &mut Sheet) {
        let tied = |f: &Found| matches!(f, Found::Passive { tied: true, .. });
        let any = self.answers.iter().zip(pick).any(|(a, &set)| a.found.get(set).is_some_and(tied));
        if !any && !self.rails.loops {
            return;
        }
        let (mut arcs, branches) = self.arcs(pick, sheet);
        cancel_idle(self.rails.tainted.len(), &mut arcs);
        for (arc, &branch) in arcs.iter().zip(&branches) {
            if sheet.currents[branch as usize].is_finite() {
                sheet.currents[branch as usize] = arc.current;
            }
            if arc.current == 0.0 && sheet.places[branch as usize] != Place::Unknown {
                sheet.places[branch as usize] = Place::Blocking;
            }
        }
        for (range, branch) in current_ranges(self.rails.tainted.len(), &arcs).into_iter().zip(branches) {
            let current = &mut sheet.currents[branch as usize];
            if current.is_nan() && range == Some(ANY) && !self.is_contradictory(branch) {
                *current = 0.0;
            }
            if current.is_finite() {
                sheet.ranges[branch as usize] = range;
            }
        }
    }

    fn is_contradictory(&self, branch: u32) -> bool {
        self.rails.contradictions.iter().any(|part| part.branches.contains(&branch))
    }

    /// Every branch whose voltage stands while its current changes.
    fn arcs(&self, pick: &[usize], sheet: &Sheet) -> (Vec<Arc>, Vec<u32>) {
        let (mut arcs, mut branches) = (Vec::new(), Vec::new());
        for (n, b) in self.network.branches.iter().enumerate() {
            let Some(level) = fixed(b.law) else { continue };
            let current = if sheet.currents[n].is_finite() { sheet.currents[n] } else { 0.0 };
            arcs.push(Arc {
                from: b.from,
                to: b.to,
                current,
                rise: f64::INFINITY,
                fall: f64::INFINITY,
                idle: level.value == 0.0,
                short: b.law == Law::Short,
            });
            branches.push(n as u32);
        }
        for (answer, &set) in self.answers.iter().zip(pick) {
            if let Some(Found::Passive { built, point, tied: true }) = answer.found.get(set) {
                let volts = built.part.scales().volts;
                for (n, d) in built.part.diodes.iter().enumerate().filter(|(_, d)| d.series == 0.0) {
                    let state = match point.states[n] {
                        State::Blocking => at_level(d, &built.part, &point.potentials, volts),
                        state => Some(state),
                    };
                    let Some(state) = state else { continue };
                    let b = &self.network.branches[built.diodes[n] as usize];
                    let current = sheet.currents[built.diodes[n] as usize];
                    let forward = state == State::Forward;
                    arcs.push(Arc {
                        from: b.from,
                        to: b.to,
                        current,
                        rise: if forward { f64::INFINITY } else { -current },
                        fall: if forward { current } else { f64::INFINITY },
                        idle: forward && d.forward == 0.0,
                        short: false,
                    });
                    branches.push(built.diodes[n]);
                }
            }
        }
        (arcs, branches)
    }

    /// Answers (and last, the ties between boundaries) whose currents are open, shorts apart.
    fn shared_answers(&self, sheet: &Sheet) -> Vec<bool> {
        let open = |&n: &u32| {
            sheet.ranges[n as usize].is_some() && self.network.branches[n as usize].law != Law::Short
        };
        let mut shared: Vec<bool> = self.answers.iter().map(|a| a.piece.branches.iter().any(open)).collect();
        let all = (0..self.network.branches.len() as u32).filter(open).count();
        let inside: usize =
            self.answers.iter().map(|a| a.piece.branches.iter().filter(|n| open(n)).count()).sum();
        shared.push(all > inside);
        shared
    }

    /// Open potentials of a passive part; whether there are any.
    fn fill_room(&self, n: usize, set: usize, sheet: &mut Sheet) -> bool {
        let answer = &self.answers[n];
        let Some(Found::Passive { built, point, .. }) = answer.found.get(set) else { return false };
        let binds: Vec<bool> = built
            .diodes
            .iter()
            .zip(&point.states)
            .map(|(&branch, &state)| {
                state != State::Blocking || sheet.ranges[branch as usize].is_some_and(|r| r.low != r.high)
            })
            .collect();
        let open = potentials(&built.part, point, &binds);
        let mut floating = false;
        for (k, &group) in answer.piece.groups.iter().enumerate() {
            let room = open.room[open.island[k + 1] as usize];
            let size = point.potentials[k + 1].abs().max(1e-300);
            for &node in self.rails.nodes_of(group) {
                if open.island[k + 1] != 0 && !is_point(room, size.max(sheet.potentials[node as usize].abs()))
                {
                    sheet.room[node as usize] = room;
                    floating = true;
                }
            }
        }
        self.fill_diode_voltages(built, point, &open, sheet);
        floating
    }

    /// Voltages of branches inside a part follow its islands, even where both ends are open.
    fn fill_diode_voltages(&self, built: &Built, point: &Point, open: &Potentials, sheet: &mut Sheet) {
        let part = &built.part;
        let resistors = part.resistors.iter().map(|r| (r.p, r.q, r.delta)).zip(&built.resistors);
        let diodes = part.diodes.iter().map(|d| (d.p, d.q, d.delta)).zip(&built.diodes);
        for ((p, q, delta), &branch) in resistors.chain(diodes) {
            let (up, uq) = (point.potentials[p as usize], point.potentials[q as usize]);
            let v = (up - uq + delta).round();
            let room = open.between(p, q);
            let size = up.abs() + uq.abs() + delta.abs();
            sheet.voltages[branch as usize] = if is_point(room, size) {
                Quantity::Known(v)
            } else {
                Quantity::Open(Interval { low: v + room.low, high: v + room.high })
            };
        }
    }

    fn fill_general(&self, pick: &[usize], sheet: &mut Sheet, shared: &mut [bool], floating: &mut [bool]) {
        for (n, (answer, &set)) in self.answers.iter().zip(pick).enumerate() {
            if let Some(Found::General(set)) = answer.found.get(set) {
                let (s, f) =
                    set.fill_open(&mut sheet.room, &mut sheet.ranges, &mut sheet.places, &mut sheet.voltages);
                shared[n] |= s;
                floating[n] |= f;
            }
        }
    }

    /// Voltages that no part has told: between parts, of ties, of current sources.
    fn fill_voltages(&self, sheet: &mut Sheet) {
        for (n, b) in self.network.branches.iter().enumerate() {
            if let Some(level) = fixed(b.law) {
                sheet.voltages[n] = Quantity::Known(level.value);
                continue;
            }
            let (p, q) = (b.from as usize, b.to as usize);
            let v = sheet.potentials[p] - sheet.potentials[q];
            if sheet.voltages[n] != Quantity::Unknown || v.is_nan() {
                continue;
            }
            let (rp, rq) = (sheet.room[p], sheet.room[q]);
            sheet.voltages[n] =
                if (rp == STILL && rq == STILL) || self.rails.forest.group[p] == self.rails.forest.group[q] {
                    Quantity::Known(v)
                } else {
                    Quantity::Open(Interval { low: v + rp.low - rq.high, high: v + rp.high - rq.low })
                };
        }
    }

    /// Turns `Unique` into what is open.
    fn note_openness(&mut self, shared: &[bool], floating: &[bool], sheet: &Sheet) {
        for (n, answer) in self.answers.iter_mut().enumerate() {
            if answer.verdict == Verdict::Unique {
                answer.verdict = match (shared[n], floating[n]) {
                    (false, false) => Verdict::Unique,
                    (true, false) => Verdict::Shared,
                    (false, true) => Verdict::Floating,
                    (true, true) => Verdict::SharedFloating,
                };
            }
        }
        if shared.last() == Some(&true) {
            let open = |n: &&u32| sheet.ranges[**n as usize].is_some();
            let branches = self.rails.branch.iter().filter(open).copied().collect();
            let piece = super::parts::Piece {
                kind: super::parts::Kind::Passive,
                groups: Vec::new(),
                branches,
                tainted: false,
            };
            self.answers.push(Answer {
                piece,
                verdict: Verdict::Shared,
                reasons: Vec::new(),
                found: Vec::new(),
                truncated: false,
                solves: 0,
            });
        }
    }

    fn finish(&self, sheet: Sheet) -> Solution {
        let potentials =
            sheet.potentials.iter().zip(&sheet.room).map(|(&v, &room)| quantity(v, shifted(v, room)));
        let potentials = potentials.collect();
        let currents: Vec<Quantity> =
            sheet.currents.iter().zip(&sheet.ranges).map(|(&i, &range)| quantity(i, range)).collect();
        let places = sheet.places.iter().zip(&currents).map(|(&place, i)| match i {
            Quantity::Open(range) if place != Place::Unknown => place_of(*range),
            _ => place,
        });
        Solution {
            potentials,
            voltages: sheet.voltages,
            places: places.collect(),
            currents,
            sample: (sheet.potentials, sheet.currents),
        }
    }
}

fn shifted(v: f64, room: Interval) -> Option<Interval> {
    (room != STILL).then_some(Interval { low: v + room.low, high: v + room.high })
}

fn quantity(value: f64, range: Option<Interval>) -> Quantity {
    match range {
        _ if value.is_nan() => Quantity::Unknown,
        Some(range) => Quantity::Open(range),
        None => Quantity::Known(value),
    }
}

fn place_of(range: Interval) -> Place {
    match (range.low < 0.0, range.high > 0.0) {
        (true, true) => Place::Open,
        (false, true) => Place::Conducting,
        (true, false) => Place::Breakdown,
        (false, false) => Place::Blocking,
    }
}

/// The most serious verdict; open currents of one part and open voltages of another are both.
fn most_serious(verdicts: impl Iterator<Item = Verdict>) -> Verdict {
    verdicts.fold(Verdict::Unique, |a, b| match (a, b) {
        (Verdict::Shared, Verdict::Floating) | (Verdict::Floating, Verdict::Shared) => {
            Verdict::SharedFloating
        }
        _ => a.max(b),
    })
}
