//! One stage: from the states at its start and the inputs at its end to the states at its end, for assumed modes of
//! the junctions. Small systems are condensed to the few numbers that are asked for; large ones are factored.

use super::dense::Condensed;
use super::sparse::Sparse;
use super::system::{Mode, System};
use rustc_hash::FxHashMap;

/// More unknowns than this are factored as a sparse matrix.
const MOST_CONDENSED: usize = 120;

/// Numbers that kept stages may take.
const MOST_KEPT: usize = 8_000_000;

/// Lengths that differ in their last digits only are one.
fn bits(length: f64) -> u64 {
    if length.is_nan() { u64::MAX } else { (length.to_bits() + (1 << 13)) >> 14 }
}

/// Modes of all junctions and positions of all gates.
#[derive(Debug, Clone, PartialEq, Eq, Hash, Default)]
pub(crate) struct Pattern {
    pub(super) modes: Vec<Mode>,
    pub(super) closed: Vec<bool>,
}

/// What a stage gives.
#[derive(Debug, Clone, Default)]
pub(crate) struct Answer {
    /// States at its end.
    pub(super) states: Vec<f64>,
    /// For each junction: its inner voltage where it is assumed to block, else its current.
    pub(super) tests: Vec<f64>,
}

/// A system made ready for stages.
pub(crate) struct Solver {
    system: System,
    /// The pattern that holds.
    pub(super) pattern: Pattern,
    pattern_id: u32,
    patterns: FxHashMap<Pattern, u32>,
    kept: FxHashMap<(u32, u64), Condensed>,
    kept_size: usize,
    sparse: Option<Box<Sparse>>,
    /// Factorizations done.
    pub(crate) factorizations: u64,
    /// Work that they took and nobody has counted yet, in multiplications.
    pub(super) uncounted: u64,
    right: Vec<f64>,
    unknowns: Vec<f64>,
}

impl Solver {
    /// For a system; `None` where it is too large to be ordered.
    pub fn new(system: System) -> Option<Self> {
        let pattern = Pattern {
            modes: vec![Mode::Blocking; system.junctions.len()],
            closed: vec![false; system.gates.len()],
        };
        let is_small = system.unknowns() <= MOST_CONDENSED;
        let sparse = if is_small { None } else { Some(Box::new(Sparse::new(&system)?)) };
        let n = system.unknowns();
        let mut solver = Solver {
            system,
            pattern,
            pattern_id: 0,
            patterns: FxHashMap::default(),
            kept: FxHashMap::default(),
            kept_size: 0,
            sparse,
            factorizations: 0,
            uncounted: 0,
            right: vec![0.0; n],
            unknowns: vec![0.0; n],
        };
        solver.pattern_changed();
        Some(solver)
    }

    /// The system.
    pub fn system(&self) -> &System {
        &self.system
    }

    /// Whether steps are condensed, so that many of them cost little.
    pub fn is_condensed(&self) -> bool {
        self.sparse.is_none()
    }

    /// What one stage costs, in multiplications.
    pub fn cost(&self) -> u64 {
        let (m, d, k) = (self.system.cells.len(), self.system.junctions.len(), self.system.inputs);
        match &self.sparse {
            None => (60 + 8 * k + (m + d) * (m + k + 1)) as u64,
            Some(sparse) => sparse.cost() + 8 * k as u64,
        }
    }

    /// What condensing a stage costs, in multiplications.
    fn condensing(&self) -> u64 {
        let n = self.system.unknowns() as u64;
        let width = (self.system.cells.len() + self.system.inputs + 1) as u64;
        n * n * (n / 3 + 2 * width) + 1000
    }

    /// The modes of the junctions.
    pub fn modes(&self) -> &[Mode] {
        &self.pattern.modes
    }

    /// Sets the gates.
    pub fn set_gates(&mut self, closed: &[bool]) {
        if self.pattern.closed != closed {
            self.pattern.closed.copy_from_slice(closed);
            self.pattern_changed();
        }
    }

    pub(super) fn pattern_changed(&mut self) {
        let next = self.patterns.len() as u32;
        self.pattern_id = *self.patterns.entry(self.pattern.clone()).or_insert(next);
    }

    /// Forgets what the steps up to here have left: used where a walk begins anew.
    pub fn set_modes(&mut self, modes: &[Mode]) {
        if self.pattern.modes != modes {
            self.pattern.modes.copy_from_slice(modes);
            self.pattern_changed();
        }
    }

    /// Solves a stage of length `g` for the modes that are assumed now. `false` where that cannot be solved.
    pub(super) fn stage(&mut self, g: f64, from: &[f64], inputs: &[f64], answer: &mut Answer) -> bool {
        self.uncounted += self.cost();
        if self.sparse.is_some() {
            return self.sparse_stage(&|_| g, g, from, inputs, answer);
        }
        let key = (self.pattern_id, bits(g));
        if let Some(kept) = self.kept.get(&key) {
            return kept.stage(from, inputs, answer);
        }
        self.uncounted += self.condensing();
        let Some(made) = Condensed::new(&self.system, &self.pattern, &|_| g) else { return false };
        self.factorizations += 1;
        let is_done = made.stage(from, inputs, answer);
        if self.kept_size > MOST_KEPT {
            self.kept.clear();
            self.kept_size = 0;
        }
        self.kept_size += made.size();
        self.kept.insert(key, made);
        is_done
    }

    /// A stage in which each cell has a length of its own; nothing is kept.
    pub(super) fn stage_of_lengths(
        &mut self,
        lengths: &[f64],
        from: &[f64],
        inputs: &[f64],
        answer: &mut Answer,
    ) -> bool {
        let g = |n: usize| lengths.get(n).copied().unwrap_or(1.0);
        self.uncounted += self.cost();
        if self.sparse.is_some() {
            return self.sparse_stage(&g, f64::NAN, from, inputs, answer);
        }
        self.factorizations += 1;
        self.uncounted += self.condensing();
        let made = Condensed::new(&self.system, &self.pattern, &g);
        made.is_some_and(|made| made.stage(from, inputs, answer))
    }

    fn sparse_stage(
        &mut self,
        g: &dyn Fn(usize) -> f64,
        key: f64,
        from: &[f64],
        inputs: &[f64],
        answer: &mut Answer,
    ) -> bool {
        let Solver {
            system, pattern, pattern_id, sparse, right, unknowns, factorizations, uncounted, ..
        } = self;
        let Some(sparse) = sparse else { return false };
        let before = *factorizations;
        system.right_side(&pattern.modes, &pattern.closed, g, from, inputs, right);
        let is_prepared = sparse.prepare(system, pattern, (*pattern_id, bits(key)), g, factorizations);
        *uncounted += (*factorizations - before) * 8 * sparse.cost();
        if !is_prepared || !sparse.solve(right, unknowns) {
            return false;
        }
        answer.states.resize(system.cells.len(), 0.0);
        system.states(unknowns, inputs, &mut answer.states);
        answer.tests.clear();
        answer.tests.extend(system.junctions.iter().zip(&pattern.modes).map(|(junction, mode)| {
            // a leak is nothing among currents, and its voltage is not to be told from it
            match mode {
                Mode::Blocking => junction.across.at(unknowns, inputs),
                _ => unknowns[junction.current as usize],
            }
        }));
        true
    }

    /// All unknowns of a stage that was solved with the same arguments just before.
    pub(super) fn unknowns(&mut self, g: f64, from: &[f64], inputs: &[f64], out: &mut Vec<f64>) {
        out.resize(self.system.unknowns(), 0.0);
        if self.sparse.is_some() {
            out.copy_from_slice(&self.unknowns);
        } else if let Some(kept) = self.kept.get(&(self.pattern_id, bits(g))) {
            self.uncounted += (out.len() * (from.len() + inputs.len() + 1)) as u64;
            kept.unknowns(from, inputs, out);
        }
    }

    /// What a change of the states at the start of a stage makes of those at its end, row by row; only where
    /// steps are condensed.
    pub(super) fn transfer(&self, g: f64) -> Option<&Condensed> {
        self.kept.get(&(self.pattern_id, bits(g)))
    }

    /// Spreads errors of the states by the stage's own equations, so that what is held fast counts nothing
    /// (Hosea & Shampine, Appl. Numer. Math. 20 (1996) 21-37).
    pub(super) fn filter(&mut self, g: f64, errors: &mut [f64], scratch: &mut Vec<f64>) {
        if let Some(kept) = self.kept.get(&(self.pattern_id, bits(g))) {
            scratch.clear();
            scratch.extend((0..errors.len()).map(|row| kept.transfer(row, errors)));
            errors.copy_from_slice(scratch);
        } else if self.sparse.is_some() {
            self.uncounted += self.cost() / 8;
            self.sparse_filter(g, errors);
        }
    }

    /// The same in a large system: one more solve with the right-hand side of the errors alone.
    fn sparse_filter(&mut self, g: f64, errors: &mut [f64]) {
        let Solver { system, pattern, sparse, right, .. } = self;
        let Some(sparse) = sparse else { return };
        // the difference of two right-hand sides is what the errors alone make
        let zero = vec![0.0; errors.len()];
        let inputs = vec![0.0; system.inputs];
        let mut without = vec![0.0; right.len()];
        system.right_side(&pattern.modes, &pattern.closed, &|_| g, &zero, &inputs, &mut without);
        system.right_side(&pattern.modes, &pattern.closed, &|_| g, errors, &inputs, right);
        for (with, without) in right.iter_mut().zip(&without) {
            *with -= without;
        }
        let mut spread = vec![0.0; right.len()];
        sparse.rough(right, &mut spread);
        for (error, cell) in errors.iter_mut().zip(&system.cells) {
            *error = match cell {
                super::Cell::Capacitance { across, .. } => {
                    across.unknowns.iter().map(|&(n, f)| f * spread[n as usize]).sum()
                }
                super::Cell::Inductance { current, .. } => spread[*current as usize],
            };
        }
    }
}
