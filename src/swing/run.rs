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

const MANY_PERIODS: &str = "the span asked for holds too many periods to walk through all of them, so the periodic state was sought instead";
const NOT_PERIODIC: &str = "the periodic state was not reached within the work that was allowed";
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

/// Follows a part. An error is the reason why it could not be.
pub(super) fn run(pass: &Pass<'_>, equations: &Equations, watched: Vec<usize>) -> Result<Ran, String> {
    let Some(solver) = Solver::new(equations.system.clone()) else {
        return Err(match equations.system.one_sided {
            true => "its part is too large to be followed over time with controlled sources in it".into(),
            false => "its part is too large to be followed over time".into(),
        });
    };
    let drive = Inputs { shapes: equations.inputs.iter().map(|&n| pass.given.shapes[n]).collect() };
    let tolerance = if solver.is_condensed() { TOLERANCE } else { COARSE_TOLERANCE };
    let mut march =
        March::new(solver, vec![0.0; equations.system.cells.len()], volts(equations, &drive, pass));
    let closed = vec![false; equations.followers.len()];
    let mut road = Road { pass, equations, drive, closed, tolerance };
    road.turn_gates(&mut march, pass.timing.first);
    start::settle(pass, equations, &road.drive, &mut march);
    let approach = road.approach(&mut march)?;
    road.window(&mut march, watched, approach)
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
    work: u64,
}

/// The time of one part, and how to walk along it.
struct Road<'a> {
    pass: &'a Pass<'a>,
    equations: &'a Equations,
    drive: Inputs<'a>,
    /// Positions of the gates now.
    closed: Vec<bool>,
    tolerance: f64,
}

impl Road<'_> {
    /// Up to the window, and to the periodic state where that is sought.
    fn approach(&mut self, march: &mut March) -> Result<Approach, String> {
        let timing = self.pass.timing;
        let (from, to) = timing.window;
        let mut approach = Approach { cut_short: None, periods: 0, periodic: true, work: 0 };
        let mut end = self.walk(march, timing.first, from, None);
        if end == End::Spent && timing.period.is_some() {
            approach.cut_short = Some(MANY_PERIODS);
            approach.work += std::mem::take(&mut march.spent);
            end = End::Done;
        }
        if end == End::Done && timing.period.is_some() && (timing.seeks_orbit || approach.cut_short.is_some())
        {
            let orbit = find_orbit(march, &mut |march| self.walk(march, from, to, None));
            approach.periods = orbit.periods;
            approach.periodic = orbit.periodic;
            end = orbit.end;
            if end == End::Spent || !orbit.periodic {
                approach.cut_short = Some(NOT_PERIODIC);
                end = if end == End::Spent { End::Done } else { end };
            }
        }
        self.fail(end)?;
        approach.work += march.spent;
        Ok(approach)
    }

    fn window(&mut self, march: &mut March, watched: Vec<usize>, approach: Approach) -> Result<Ran, String> {
        let (from, to) = self.pass.timing.window;
        let before = march.states.clone();
        let (kept, factored) = (march.steps, march.solver.factorizations);
        let mut recorder = Recorder::new(self.equations, from, march.nothing(), watched);
        let mut cut_short = approach.cut_short;
        // the window itself is always walked through once
        march.spent = 0;
        let end = self.walk(march, from, to, Some(&mut recorder));
        if end == End::Spent {
            cut_short = Some(LONG_WINDOW);
        } else {
            self.fail(end)?;
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
            work: approach.work + march.spent,
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
    fn walk(
        &mut self,
        march: &mut March,
        from: f64,
        to: f64,
        mut observer: Option<&mut dyn Observer>,
    ) -> End {
        if to <= from {
            return End::Done;
        }
        let mut edges = self.pass.timing.edges(&self.drive.shapes, from, to);
        let crossings = self.crossings(&edges);
        edges.extend(crossings);
        edges.sort_by(f64::total_cmp);
        edges.dedup_by(|b, a| *b - *a <= 1e-12 * (to - from));
        let limits = Limits {
            tolerance: self.tolerance,
            budget: self.pass.budget,
            is_cancelled: self.pass.is_cancelled,
        };
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
    fn crossings(&self, edges: &[f64]) -> Vec<f64> {
        let mut found = Vec::new();
        for n in 0..self.closed.len() {
            let (closes, opens) = self.equations.followers[n].levels;
            for pair in edges.windows(2) {
                for step in 0..rhythm::CROSSING_STEPS {
                    let at =
                        |k: usize| pair[0] + (pair[1] - pair[0]) * k as f64 / rhythm::CROSSING_STEPS as f64;
                    for level in [closes, opens] {
                        found.extend(rhythm::crossing(
                            |t| self.control(n, t) - level,
                            at(step),
                            at(step + 1),
                        ));
                    }
                }
            }
        }
        found
    }
}

/// Whether the states at the end of the window are those at its beginning, within two millionths.
fn comes_back(before: &[f64], after: &[f64]) -> bool {
    let largest = before.iter().map(|b| b.abs()).fold(1e-12, f64::max);
    let close = |(a, b): (&f64, &f64)| (a - b).abs() <= 2e-6 * b.abs().max(1e-2 * largest);
    after.iter().zip(before).all(close)
}
