//! Steps through one segment of time in which the inputs are smooth. Lengths are the segment's halved again and
//! again, so that factors can be kept; a change of modes is closed in upon until it lies within the finest step, which
//! is then an implicit Euler step with modes of its own.

use super::pace::Pace;
use super::settle::Slack;
use super::solver::{Answer, Solver};
use super::system::{Cell, Mode};

/// γ of the method.
pub(super) const GAMMA: f64 = 1.0 - std::f64::consts::FRAC_1_SQRT_2;

/// Error of a step from the second difference of its rates: the constant of its third-order term, 0.0404 (from the
/// expansion of its stability function), doubled, over 0.586, since the first stage is of first order only.
const ERROR: f64 = 0.138;

/// Share of the largest voltage or current that a test may miss.
const SLACK: f64 = 1e-9;

/// A current beyond this is one that nothing limits, amperes.
const UNLIMITED: f64 = 1e6;

/// What the inputs are worth.
pub(crate) trait Drive {
    /// Fills in all inputs at a time in seconds.
    fn at(&self, time: f64, inputs: &mut [f64]);
}

/// One step that was kept.
pub(crate) struct Step<'a> {
    /// Its beginning in seconds.
    pub start: f64,
    /// Its length.
    pub length: f64,
    /// An implicit Euler step over a change: what flows in it may be a jump.
    pub is_jump: bool,
    /// Modes at its end.
    pub modes: &'a [Mode],
    /// Weight, unknowns and inputs at its points, whose weighted sum is the integral over the step by its length.
    pub points: &'a [(f64, Vec<f64>, Vec<f64>)],
}

/// Who looks at the steps.
pub(crate) trait Observer {
    /// One after the other.
    fn step(&mut self, step: &Step<'_>);
}

/// A stretch of time in which the inputs have no corner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Segment {
    /// Seconds.
    pub start: f64,
    /// Seconds, > 0.
    pub length: f64,
    /// Halvings of the longest step.
    pub coarsest: u32,
    /// Halvings of the shortest, at most 40.
    pub finest: u32,
}

/// How much is allowed.
#[derive(Clone)]
pub(crate) struct Limits<'a> {
    /// Error of a step, as a share of the largest value that a state has had.
    pub tolerance: f64,
    /// Work in multiplications.
    pub budget: u64,
    /// Asked now and then.
    pub is_cancelled: &'a dyn Fn() -> bool,
}

/// How a walk ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum End {
    /// At the end of its time.
    Done,
    /// Somebody asked for the end.
    Cancelled,
    /// The budget is spent.
    Spent,
    /// Nothing limits the current of this junction.
    Unlimited(usize),
    /// No modes are consistent, or the equations have no answer.
    Unsolved,
}

/// A system on its way.
pub(crate) struct March {
    /// Its stages.
    pub solver: Solver,
    /// State of each cell now.
    pub states: Vec<f64>,
    /// Largest magnitude of each state so far, and of all voltages and currents.
    pub(super) most: Vec<f64>,
    volts: f64,
    given_volts: f64,
    amperes: f64,
    /// Largest capacitance: what rounding of a voltage makes of a current.
    stiffest: f64,
    /// Rates at the end of the last step, where they mean something.
    rates: Vec<f64>,
    has_rates: bool,
    /// Derivative of the states by those at the beginning of the walk, by columns; kept up where asked for.
    pub(super) derivative: Option<Vec<f64>>,
    /// Steps kept, and tried in vain.
    pub steps: u64,
    /// Tried in vain.
    pub rejected: u64,
    /// Work so far.
    pub spent: u64,
    scratch: Scratch,
}

#[derive(Default)]
struct Scratch {
    first: Answer,
    second: Answer,
    middle: Vec<f64>,
    inputs: [Vec<f64>; 2],
    errors: Vec<f64>,
    spread: Vec<f64>,
    points: Vec<(f64, Vec<f64>, Vec<f64>)>,
}

impl March {
    /// At rest in `states`; `volts` is the largest voltage of sources and levels.
    pub fn new(solver: Solver, states: Vec<f64>, volts: f64) -> Self {
        let system = solver.system();
        let farads = |cell: &Cell| match cell {
            Cell::Capacitance { farads, .. } => *farads,
            Cell::Inductance { .. } => 0.0,
        };
        let stiffest = system.cells.iter().map(farads).fold(0.0, f64::max);
        let inputs = vec![0.0; system.inputs];
        let scratch = Scratch { inputs: [inputs.clone(), inputs], ..Scratch::default() };
        March {
            most: states.iter().map(|s| s.abs()).collect(),
            rates: vec![0.0; states.len()],
            has_rates: false,
            volts,
            given_volts: volts,
            amperes: 0.0,
            stiffest,
            derivative: None,
            steps: 0,
            rejected: 0,
            spent: 0,
            scratch,
            solver,
            states,
        }
    }

    /// Work so far, in multiplications, that of the stages included.
    pub fn work(&mut self) -> u64 {
        self.spent += std::mem::take(&mut self.solver.uncounted);
        self.spent
    }

    /// Largest voltage so far.
    pub fn volts(&self) -> f64 {
        self.volts
    }

    /// Forgets how large states have been: a walk that led astray must not coarsen the next.
    pub(super) fn forget(&mut self) {
        self.volts = self.given_volts;
        self.amperes = 0.0;
        self.most.clear();
        self.most.extend(self.states.iter().map(|s| s.abs()));
        self.note_scales();
    }

    /// A current that is none: what blocking junctions leak, and rounding.
    pub fn nothing(&self) -> f64 {
        (SLACK * self.amperes).max(64.0 * super::system::LEAK * self.volts)
    }

    /// Puts the states where they are to be.
    pub fn place(&mut self, states: Vec<f64>) {
        self.states = states;
        self.note_scales();
    }

    /// States at rest: one implicit Euler step from `from`, in which each cell is given a time of its own.
    pub fn rest(&mut self, lengths: &[f64], from: &[f64], inputs: &[f64]) -> Option<Vec<f64>> {
        let mut answer = Answer::default();
        let shortest = lengths.iter().copied().fold(f64::INFINITY, f64::min);
        let slack = self.slack(shortest);
        let is_settled = self.solver.settle(
            |_| slack,
            &mut answer,
            |solver, answer| solver.stage_of_lengths(lengths, from, inputs, answer),
        );
        is_settled.then_some(answer.states)
    }

    /// What a test may miss in a stage of length `g`.
    pub(super) fn slack(&self, g: f64) -> Slack {
        let noise = 4.0 * f64::EPSILON * self.volts * self.stiffest / g;
        Slack { voltage: SLACK * self.volts, current: SLACK * self.amperes + noise + 1e-15 }
    }

    /// Walks through a segment; its first step is an implicit Euler step, since the inputs may have jumped.
    pub fn walk(
        &mut self,
        segment: Segment,
        drive: &dyn Drive,
        mut observer: Option<&mut dyn Observer>,
        limits: &Limits<'_>,
    ) -> End {
        let mut pace = Pace::of(&segment);
        let clock = Clock { segment, ticks: pace.ticks };
        self.has_rates = false;
        while pace.at < pace.ticks {
            if self.steps & 63 == 0 && (limits.is_cancelled)() {
                return End::Cancelled;
            }
            if self.work() > limits.budget {
                return End::Spent;
            }
            let (size, from) = (pace.size(), clock.time(pace.at));
            let length = clock.length(size);
            if pace.must_jump {
                if let Err(end) = self.jump(from, length, drive, observer.as_deref_mut()) {
                    return end;
                }
                pace.jumped(size);
                continue;
            }
            match self.attempt(from, length, drive, limits.tolerance, pace.can_halve()) {
                Tried::Kept(error) => {
                    if let Some(observer) = observer.as_deref_mut() {
                        self.show(from, length, observer);
                    }
                    if let Some(end) = self.keep(length) {
                        return end;
                    }
                    pace.kept(size, error);
                }
                Tried::Unsolved => return End::Unsolved,
                tried @ (Tried::Coarse | Tried::Changed) => {
                    self.rejected += 1;
                    pace.rejected(matches!(tried, Tried::Changed));
                }
            }
        }
        End::Done
    }

    /// The two stages of a step; nothing is changed but the scratch.
    fn attempt(&mut self, start: f64, h: f64, drive: &dyn Drive, tolerance: f64, can_halve: bool) -> Tried {
        let g = GAMMA * h;
        let slack = self.slack(g);
        let s = &mut self.scratch;
        drive.at(start + g, &mut s.inputs[0]);
        if !self.solver.stage(g, &self.states, &s.inputs[0], &mut s.first) {
            return Tried::Unsolved;
        }
        if self.solver.is_any_wrong(&s.first.tests, slack) {
            return Tried::Changed;
        }
        let weight = (1.0 - GAMMA) / GAMMA;
        s.middle.clear();
        s.middle
            .extend(self.states.iter().zip(&s.first.states).map(|(from, to)| from + weight * (to - from)));
        if !self.solver.is_condensed() {
            // the second stage overwrites the unknowns of the first
            let mut unknowns = std::mem::take(&mut s.spread);
            self.solver.unknowns(g, &self.states, &s.inputs[0], &mut unknowns);
            s.spread = unknowns;
        }
        drive.at(start + h, &mut s.inputs[1]);
        if !self.solver.stage(g, &s.middle, &s.inputs[1], &mut s.second) {
            return Tried::Unsolved;
        }
        if self.solver.is_any_wrong(&s.second.tests, slack) {
            return Tried::Changed;
        }
        match self.error(h, tolerance) {
            Some(error) if error > 1.0 && can_halve => Tried::Coarse,
            error => Tried::Kept(error.unwrap_or(0.0)),
        }
    }

    /// Largest error of the step, by what is allowed; `None` where the step before tells no rates.
    fn error(&mut self, h: f64, tolerance: f64) -> Option<f64> {
        if !self.has_rates || self.states.is_empty() {
            return None;
        }
        let g = GAMMA * h;
        let s = &mut self.scratch;
        s.errors.clear();
        let ends = s.first.states.iter().zip(&s.middle).zip(&s.second.states);
        for (((from, rate), ((first, middle), second)), _) in
            self.states.iter().zip(&self.rates).zip(ends).zip(&self.most)
        {
            let (k1, k2) = ((first - from) / g, (second - middle) / g);
            s.errors.push(ERROR * h * ((k2 - k1) / (1.0 - GAMMA) - (k1 - rate) / GAMMA));
        }
        let mut spread = Vec::new();
        self.solver.filter(g, &mut s.errors, &mut spread);
        let shares = s.errors.iter().zip(self.solver.system().cells.iter().zip(&self.most));
        let floors = floors(self.solver.system(), &self.most);
        Some(
            shares
                .map(|(error, (cell, most))| error.abs() / (tolerance * most.max(floors[kind(cell)])))
                .fold(0.0, f64::max),
        )
    }

    /// Takes the step that was tried.
    fn keep(&mut self, h: f64) -> Option<End> {
        let g = GAMMA * h;
        let s = &mut self.scratch;
        for ((rate, middle), second) in self.rates.iter_mut().zip(&s.middle).zip(&s.second.states) {
            *rate = (second - middle) / g;
        }
        self.has_rates = true;
        if let Some(derivative) = &mut self.derivative {
            let weight = (1.0 - GAMMA) / GAMMA;
            if let Some(kept) = self.solver.transfer(g) {
                let m = self.states.len();
                self.spent += 2 * (m * m * m) as u64;
                for column in derivative.chunks_exact_mut(m.max(1)) {
                    let first: Vec<f64> = (0..m).map(|row| kept.transfer(row, column)).collect();
                    let middle: Vec<f64> =
                        column.iter().zip(&first).map(|(from, to)| from + weight * (to - from)).collect();
                    for (row, value) in column.iter_mut().enumerate() {
                        *value = kept.transfer(row, &middle);
                    }
                }
            }
        }
        self.steps += 1;
        std::mem::swap(&mut self.states, &mut s.second.states);
        for (n, (&test, mode)) in s.second.tests.iter().zip(&self.solver.pattern.modes).enumerate() {
            if *mode == Mode::Blocking {
                continue;
            }
            if test.abs() > UNLIMITED {
                return Some(End::Unlimited(n));
            }
            self.amperes = self.amperes.max(test.abs());
        }
        self.note_scales();
        None
    }

    fn note_scales(&mut self) {
        for ((most, state), cell) in self.most.iter_mut().zip(&self.states).zip(&self.solver.system().cells) {
            *most = most.max(state.abs());
            match cell {
                Cell::Capacitance { .. } => self.volts = self.volts.max(*most),
                Cell::Inductance { .. } => self.amperes = self.amperes.max(*most),
            }
        }
    }

    /// An implicit Euler step with modes of its own.
    fn jump(
        &mut self,
        from: f64,
        h: f64,
        drive: &dyn Drive,
        observer: Option<&mut (dyn Observer + '_)>,
    ) -> Result<(), End> {
        let slack = self.slack(h);
        drive.at(from + h, &mut self.scratch.inputs[1]);
        let Scratch { inputs, second, .. } = &mut self.scratch;
        let states = &self.states;
        let is_settled = self.solver.settle(
            |_| slack,
            second,
            |solver, answer| solver.stage(h, states, &inputs[1], answer),
        );
        if !is_settled {
            return Err(End::Unsolved);
        }
        if let Some(observer) = observer {
            let mut unknowns = Vec::new();
            self.solver.unknowns(h, states, &inputs[1], &mut unknowns);
            let points = [(1.0, unknowns, inputs[1].clone())];
            let modes = self.solver.modes();
            observer.step(&Step { start: from, length: h, is_jump: true, modes, points: &points });
        }
        if let (Some(derivative), Some(kept)) = (&mut self.derivative, self.solver.transfer(h)) {
            let m = self.states.len();
            self.spent += (m * m * m) as u64;
            for column in derivative.chunks_exact_mut(m.max(1)) {
                let next: Vec<f64> = (0..m).map(|row| kept.transfer(row, column)).collect();
                column.copy_from_slice(&next);
            }
        }
        std::mem::swap(&mut self.states, &mut second.states);
        self.has_rates = false;
        self.steps += 1;
        self.note_scales();
        Ok(())
    }

    /// Shows the step that was tried, before it is taken.
    fn show(&mut self, start: f64, h: f64, observer: &mut (dyn Observer + '_)) {
        let g = GAMMA * h;
        let mut points = std::mem::take(&mut self.scratch.points);
        points.resize(2, (0.0, Vec::new(), Vec::new()));
        let s = &self.scratch;
        if self.solver.is_condensed() {
            self.solver.unknowns(g, &self.states, &s.inputs[0], &mut points[0].1);
        } else {
            points[0].1.clone_from(&s.spread);
        }
        self.solver.unknowns(g, &s.middle, &s.inputs[1], &mut points[1].1);
        for (n, point) in points.iter_mut().enumerate() {
            point.0 = [1.0 - GAMMA, GAMMA][n];
            point.2.clone_from(&s.inputs[n]);
        }
        let modes = self.solver.modes();
        observer.step(&Step { start, length: h, is_jump: false, modes, points: &points });
        self.scratch.points = points;
    }
}

/// What became of a step that was tried.
enum Tried {
    /// Its error, by what is allowed.
    Kept(f64),
    /// Its error is too large.
    Coarse,
    /// A mode is wrong at one of its points.
    Changed,
    Unsolved,
}

pub(super) fn kind(cell: &Cell) -> usize {
    usize::from(matches!(cell, Cell::Inductance { .. }))
}

/// A state that is small beside the others of its kind need not be known as finely.
pub(super) fn floors(system: &super::System, most: &[f64]) -> [f64; 2] {
    let mut floors = [1e-12f64; 2];
    for (cell, most) in system.cells.iter().zip(most) {
        floors[kind(cell)] = floors[kind(cell)].max(1e-2 * most);
    }
    floors
}

struct Clock {
    segment: Segment,
    ticks: u64,
}

impl Clock {
    fn time(&self, at: u64) -> f64 {
        self.segment.start + self.length(at)
    }

    /// The same for the same number of ticks, wherever they are, so that factors are found again.
    fn length(&self, ticks: u64) -> f64 {
        self.segment.length * (ticks as f64 / self.ticks as f64)
    }
}
