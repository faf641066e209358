//! Steps one part through its time: where it starts, which stretches it walks, the periodic state, and the window
//! whose figures are kept.

use super::equations::Equations;
use super::inputs::Given;
use super::record::Recorder;
use super::result::{Effort, Level, OverTime};
use super::rhythm;
use super::start;
use super::timing::Timing;
use crate::circuit::{Circuit, Shape};
use crate::complementarity::stepping::{Drive, End, Limits, March, Observer, Solver, find_orbit};

/// Error of a step, as a share of the largest value of the state: keeps a decay within 1e-6.
const TOLERANCE: f64 = 4e-9;

/// The same in large systems, where a step costs much.
const COARSE_TOLERANCE: f64 = 1e-6;

/// Periods from which the work of all is reckoned up, and what share of what is allowed that may seem to be: a state that
/// settles takes fewer steps.
const TRIED_PERIODS: f64 = 8.0;
const ROOM: f64 = 1.5;

const MANY_PERIODS: &str = "the span asked for holds too many periods to walk through all of them, so the periodic state was sought instead";
const NOT_PERIODIC: &str = "the periodic state was not reached within the work that was allowed";
const MANY_CORNERS: &str = "sources have more edges in the time looked at than are kept apart, so that narrow pulses may have been stepped over";
const LONG_WINDOW: &str = "the time looked at takes more work than was allowed, so its end is missing";

/// What the whole pass may know and spend.
pub(super) struct Pass<'a> {
    pub circuit: &'a Circuit,
    pub given: &'a Given<'a>,
    pub timing: Timing,
    /// Work that a part may do, in multiplications.
    pub budget: u64,
    pub is_cancelled: &'a dyn Fn() -> bool,
}

/// What came of one part.
pub(super) struct Ran {
    pub diodes: Vec<OverTime>,
    pub nodes: Vec<Level>,
    pub waves: Vec<Vec<(f64, f64)>>,
    pub periodic: bool,
    pub cut_short: Option<String>,
    pub effort: Effort,
    /// Work that it took, in multiplications.
    pub work: u64,
}

struct Inputs<'a> {
    shapes: Vec<&'a Shape>,
}

impl Drive for Inputs<'_> {
    fn at(&self, time: f64, inputs: &mut [f64]) {
        for (input, shape) in inputs.iter_mut().zip(&self.shapes) {
            *input = shape.value(time);
        }
    }
}

/// Why a part could not be followed, and the work that was spent on finding out.
pub(super) struct Failed {
    pub reason: String,
    pub work: u64,
}

impl From<String> for Failed {
    fn from(reason: String) -> Self {
        Failed { reason, work: 0 }
    }
}

/// Follows a part.
pub(super) fn run(pass: &Pass<'_>, equations: &Equations, watched: Vec<usize>) -> Result<Ran, Failed> {
    let Some(solver) = Solver::new(equations.system.clone()) else {
        return Err(Failed::from(match equations.system.one_sided {
            true => "its part is too large to be followed over time with controlled sources in it".to_owned(),
            false => "its part is too large to be followed over time".to_owned(),
        }));
    };
    let drive = Inputs { shapes: equations.inputs.iter().map(|&n| pass.given.shapes[n]).collect() };
    let tolerance = if solver.is_condensed() { TOLERANCE } else { COARSE_TOLERANCE };
    let mut march =
        March::new(solver, vec![0.0; equations.system.cells.len()], volts(equations, &drive, pass));
    let closed = vec![false; equations.followers.len()];
    let mut road = Road {
        pass,
        equations,
        drive,
        closed,
        tolerance,
        budget: pass.budget,
        edges: None,
        is_complete: true,
    };
    road.turn_gates(&mut march, pass.timing.first);
    start::settle(pass, equations, &road.drive, &mut march);
    let ran = road.approach(&mut march).and_then(|approach| road.window(&mut march, watched, approach));
    ran.map_err(|reason| Failed { reason, work: march.work() })
}

/// Largest voltage that the sources of a part reach.
fn volts(equations: &Equations, drive: &Inputs<'_>, pass: &Pass<'_>) -> f64 {
    let stop = Some(pass.timing.window.1);
    let most = |shape: &&Shape| {
        let (most, least) = shape.extremes(stop);
        shape.value(most).abs().max(shape.value(least).abs())
    };
    drive.shapes.iter().map(most).fold(equations.volts.max(1e-3), f64::max)
}

/// How the beginning of the window was reached.
struct Approach {
    cut_short: Option<&'static str>,
    periods: u64,
    periodic: bool,
}

/// The time of one part, and how to walk along it.
struct Road<'a> {
    pass: &'a Pass<'a>,
    equations: &'a Equations,
    drive: Inputs<'a>,
    /// Positions of the gates now.
    closed: Vec<bool>,
    tolerance: f64,
    /// All work up to which the walk in hand may go.
    budget: u64,
    /// Ends of the stretches between two times that were walked last.
    edges: Option<((f64, f64), Vec<f64>)>,
    /// No corner was left out so far.
    is_complete: bool,
}

impl Road<'_> {
    /// Up to the window, and to the periodic state where that is sought.
    fn approach(&mut self, march: &mut March) -> Result<Approach, String> {
        let timing = self.pass.timing;
        let (from, to) = timing.window;
        let mut approach = Approach { cut_short: None, periods: 0, periodic: true };
        let all = self.pass.budget;
        // where the periodic state can be sought instead, half is left for that
        self.budget = if timing.period.is_some() { all / 2 } else { all };
        let mut end = self.walk_up(march, timing.first, from);
        if end == End::Spent && timing.period.is_some() {
            approach.cut_short = Some(MANY_PERIODS);
            end = End::Done;
        }
        if end == End::Done && timing.period.is_some() && (timing.seeks_orbit || approach.cut_short.is_some())
        {
            let mut longest = 0;
            let orbit = find_orbit(march, &mut |march| {
                let before = march.work();
                // the window must be walked through once more, and costs what a period does
                self.budget = match longest {
                    0 => before + all.saturating_sub(before) / 2,
                    longest => all.saturating_sub(longest + longest / 4),
                };
                let end = self.walk(march, from, to, None);
                longest = longest.max(march.work() - before);
                end
            });
            approach.periods = orbit.periods;
            approach.periodic = orbit.periodic;
            end = orbit.end;
            if end == End::Spent || !orbit.periodic {
                approach.cut_short = Some(NOT_PERIODIC);
                end = if end == End::Spent { End::Done } else { end };
            }
        }
        self.fail(end)?;
        Ok(approach)
    }

    /// From one time to another where a period ends. Where the first of many periods show that all of them would take more
    /// than is allowed, it ends as if that were spent already.
    fn walk_up(&mut self, march: &mut March, from: f64, to: f64) -> End {
        let timing = self.pass.timing;
        let periods = timing.period.map_or(0.0, |period| ((to - from) / period).floor());
        if periods < 4.0 * TRIED_PERIODS {
            return self.walk(march, from, to, None);
        }
        let after = |walked: f64| to - (periods - walked) * timing.period.unwrap_or(0.0);
        let (first, second) = (after(TRIED_PERIODS), after(2.0 * TRIED_PERIODS));
        // the first ones cost more, since what is prepared for them is kept for the rest
        let mut end = self.walk(march, from, first, None);
        let before = march.work();
        if end == End::Done {
            end = self.walk(march, first, second, None);
        }
        let each = (march.work() - before) as f64 / TRIED_PERIODS;
        match end {
            End::Done if each * periods > ROOM * self.budget as f64 => End::Spent,
            End::Done => self.walk(march, second, to, None),
            end => end,
        }
    }

    fn window(&mut self, march: &mut March, watched: Vec<usize>, approach: Approach) -> Result<Ran, String> {
        let (from, to) = self.pass.timing.window;
        let before = march.states.clone();
        let (kept, factored) = (march.steps, march.solver.factorizations);
        let mut recorder = Recorder::new(self.equations, from, march.nothing(), watched);
        let mut cut_short = approach.cut_short;
        self.budget = self.pass.budget;
        let end = self.walk(march, from, to, Some(&mut recorder));
        if end == End::Spent {
            cut_short = Some(LONG_WINDOW);
        } else {
            self.fail(end)?;
        }
        if !self.is_complete {
            cut_short = cut_short.or(Some(MANY_CORNERS));
        }
        let is_still = self.equations.inputs.is_empty() && self.equations.followers.is_empty();
        let periodic = approach.periodic
            && comes_back(&before, &march.states)
            && (self.pass.timing.period.is_some() || is_still);
        Ok(Ran {
            diodes: recorder.diodes(periodic),
            nodes: recorder.levels(),
            waves: recorder.waves(),
            periodic,
            cut_short: cut_short.map(str::to_owned),
            work: march.work(),
            effort: Effort {
                steps: march.steps,
                rejected: march.rejected,
                factorizations: march.solver.factorizations,
                periods: approach.periods + 1,
                window_steps: march.steps - kept,
                window_factorizations: march.solver.factorizations - factored,
            },
        })
    }

    fn fail(&self, end: End) -> Result<(), String> {
        Err(match end {
            End::Done => return Ok(()),
            End::Cancelled => "the run was ended before its part was done".into(),
            End::Spent => "its part takes more work over time than was allowed".into(),
            End::Unlimited(n) => {
                let name = self.equations.diodes.get(n).map(|&id| self.pass.circuit.element_name(id));
                format!("nothing limits the current through {}", name.unwrap_or_default())
            }
            End::Unsolved => "the equations of its part have no consistent answer at some instant".into(),
        })
    }

    /// Walks from one time to another, corner by corner.
    fn walk(&mut self, march: &mut March, from: f64, to: f64, observer: Option<&mut dyn Observer>) -> End {
        if to <= from {
            return End::Done;
        }
        let edges = match self.edges.take() {
            Some((span, edges)) if span == (from, to) => edges,
            _ => match self.stretches(march, from, to) {
                Ok(edges) => edges,
                Err(end) => return end,
            },
        };
        let end = self.walk_along(march, &edges, observer);
        self.edges = Some(((from, to), edges));
        end
    }

    /// Ends of the stretches in which no source has a corner and no switch turns.
    fn stretches(&mut self, march: &mut March, from: f64, to: f64) -> Result<Vec<f64>, End> {
        let (mut edges, is_complete) = self.pass.timing.edges(&self.drive.shapes, from, to);
        self.is_complete &= is_complete;
        let crossings = self.crossings(march, &edges)?;
        edges.extend(crossings);
        edges.sort_by(f64::total_cmp);
        edges.dedup_by(|b, a| *b - *a <= 1e-12 * (to - from));
        Ok(edges)
    }

    fn walk_along(
        &mut self,
        march: &mut March,
        edges: &[f64],
        mut observer: Option<&mut dyn Observer>,
    ) -> End {
        let limits =
            Limits { tolerance: self.tolerance, budget: self.budget, is_cancelled: self.pass.is_cancelled };
        for pair in edges.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            self.turn_gates(march, 0.5 * (a + b));
            let diodes = self.equations.diodes.len();
            let segment = self.pass.timing.segment(&self.drive.shapes, a, b, diodes);
            let end = match &mut observer {
                Some(observer) => march.walk(segment, &self.drive, Some(&mut **observer), &limits),
                None => march.walk(segment, &self.drive, None, &limits),
            };
            if end != End::Done {
                return end;
            }
        }
        End::Done
    }

    /// Control voltage of a switch.
    fn control(&self, n: usize, time: f64) -> f64 {
        let control = &self.equations.followers[n].control;
        let moving = control.inputs.iter().map(|&(input, factor)| {
            factor * self.pass.given.shapes.get(input as usize).map_or(0.0, |shape| shape.value(time))
        });
        control.constant + moving.sum::<f64>()
    }

    /// Sets the switches as their control voltages stand; between their levels they stay.
    fn turn_gates(&mut self, march: &mut March, time: f64) {
        if self.closed.is_empty() {
            return;
        }
        for n in 0..self.closed.len() {
            let (closes, opens) = self.equations.followers[n].levels;
            match self.control(n, time) {
                v if v > closes => self.closed[n] = true,
                v if v < opens => self.closed[n] = false,
                _ => {}
            }
        }
        march.solver.set_gates(&self.closed);
    }

    /// Times at which a control voltage passes a level.
    fn crossings(&self, march: &mut March, edges: &[f64]) -> Result<Vec<f64>, End> {
        let mut found = Vec::new();
        for n in 0..self.closed.len() {
            let (closes, opens) = self.equations.followers[n].levels;
            let moving = self.equations.followers[n].control.inputs.len() as u64;
            for pair in edges.windows(2) {
                march.spent += rhythm::CROSSING_STEPS as u64 * VALUE * (moving + 1);
                if (self.pass.is_cancelled)() {
                    return Err(End::Cancelled);
                }
                if march.work() > self.budget {
                    return Err(End::Spent);
                }
                let at = |k: usize| pair[0] + (pair[1] - pair[0]) * k as f64 / rhythm::CROSSING_STEPS as f64;
                let mut before = self.control(n, at(0));
                for step in 0..rhythm::CROSSING_STEPS {
                    let after = self.control(n, at(step + 1));
                    for level in [closes, opens] {
                        // most stretches cross nothing
                        if (before > level) != (after > level) {
                            let value = |t| self.control(n, t) - level;
                            found.extend(rhythm::crossing(value, at(step), at(step + 1)));
                        }
                    }
                    before = after;
                }
            }
        }
        Ok(found)
    }
}

/// What one value of a source costs, in multiplications.
const VALUE: u64 = 16;

/// Whether the states at the end of the window are those at its beginning, within two millionths.
fn comes_back(before: &[f64], after: &[f64]) -> bool {
    let largest = before.iter().map(|b| b.abs()).fold(1e-12, f64::max);
    let close = |(a, b): (&f64, &f64)| (a - b).abs() <= 2e-6 * b.abs().max(1e-2 * largest);
    after.iter().zip(before).all(close)
}
