//! A small solver for the judge, in double precision: one network of diodes with constant drops, at rest or from step to
//! step of backward Euler. It proposes; what stands still is proved in exact arithmetic by the enumeration.

/// What joins two nodes.
#[derive(Debug, Clone, PartialEq)]
pub enum Law {
    R(f64),
    V(f64),
    I(f64),
    D {
        drop: f64,
        breakdown: Option<f64>,
        series: f64,
    },
    C(f64),
    L(f64),
    E(f64, usize, usize),
    G(f64, usize, usize),
    /// Gain and the branch listened to.
    F(f64, usize),
    H(f64, usize),
}

/// One branch; its current flows from the first node through it to the second.
#[derive(Debug, Clone, PartialEq)]
pub struct Branch {
    pub name: String,
    pub from: usize,
    pub to: usize,
    pub law: Law,
    /// `sin` or `pulse` with its numbers.
    pub shape: Option<(String, Vec<f64>)>,
}

/// A network; node 0 is ground.
#[derive(Debug, Clone, Default)]
pub struct Net {
    pub nodes: usize,
    pub branches: Vec<Branch>,
    /// Coupled inductors: positions of two branches and their mutual inductance.
    pub mutual: Vec<(usize, usize, f64)>,
}

/// A diode's state.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum State {
    Conducting,
    Blocking,
    Breakdown,
}

/// Potentials and branch currents.
#[derive(Debug, Clone)]
pub struct Answer {
    pub potentials: Vec<f64>,
    pub currents: Vec<f64>,
    pub states: Vec<State>,
}

/// So small a conductance from every node to ground leaves no node without a potential.
const LEAK: f64 = 1e-12;
/// So small a resistance in every diode leaves no loop without a current.
const BULK: f64 = 1e-6;
/// More than this is a current without limit.
const UNLIMITED: f64 = 1e4;
/// Less than this is none.
const NOTHING: f64 = 1e-8;

impl Net {
    /// At rest: capacitors open, inductors short.
    pub fn rest(&self, guess: &[State]) -> Option<Answer> {
        self.settle(guess, None)
    }

    /// One step of length `h` from an earlier answer.
    fn step(&self, before: &Answer, h: f64) -> Option<Answer> {
        self.settle(&before.states, Some((before, h)))
    }

    /// Which states each diode visits over the last quarter of `periods` of length `period`.
    pub fn visits(&self, period: f64, periods: usize) -> Option<Vec<std::collections::BTreeSet<State>>> {
        const STEPS: usize = 40;
        let h = period / STEPS as f64;
        let mut now = Answer {
            potentials: vec![0.0; self.nodes],
            currents: vec![0.0; self.branches.len()],
            states: vec![State::Blocking; self.branches.len()],
        };
        let mut seen = vec![std::collections::BTreeSet::new(); self.branches.len()];
        for k in 1..=STEPS * periods {
            let at = self.at(k as f64 * h);
            now = at.step(&now, h)?;
            if k > STEPS * periods * 3 / 4 {
                for (branch, seen) in seen.iter_mut().enumerate() {
                    seen.insert(real_state(&now, branch));
                }
            }
        }
        Some(seen)
    }

    /// The same with its sources as they are at a time.
    pub fn at(&self, t: f64) -> Net {
        let mut net = self.clone();
        for branch in &mut net.branches {
            let Some((kind, n)) = &branch.shape else { continue };
            let value = match kind.as_str() {
                "sin" => n[0] + n[1] * (std::f64::consts::TAU * n[2] * t).sin(),
                _ => {
                    let since = (t - n[2]).max(0.0) % n[6];
                    let before = t < n[2];
                    let rise = (since / n[3]).clamp(0.0, 1.0);
                    let fall = ((since - n[3] - n[5]) / n[4]).clamp(0.0, 1.0);
                    n[0] + if before { 0.0 } else { (n[1] - n[0]) * (rise - fall) }
                }
            };
            match &mut branch.law {
                Law::V(v) | Law::I(v) => *v = value,
                _ => {}
            }
        }
        net
    }

    /// Assumes states, solves, changes those that fail, until none does.
    fn settle(&self, guess: &[State], past: Option<(&Answer, f64)>) -> Option<Answer> {
        let mut states = guess.to_vec();
        states.resize(self.branches.len(), State::Blocking);
        for round in 0..200 {
            let answer = self.solve(&states, past)?;
            let wrong: Vec<(usize, State)> = (0..self.branches.len())
                .filter_map(|n| self.correction(&answer, n).map(|s| (n, s)))
                .collect();
            if wrong.is_empty() {
                let finite = answer.currents.iter().all(|i| i.abs() < UNLIMITED);
                return finite.then_some(answer);
            }
            // all at once first; then one at a time, the least first, which cannot run in a circle
            let take = if round < 20 { wrong.len() } else { 1 };
            for (n, state) in wrong.into_iter().take(take) {
                states[n] = state;
            }
        }
        None
    }

    fn correction(&self, answer: &Answer, n: usize) -> Option<State> {
        let Law::D { drop, breakdown, .. } = self.branches[n].law else { return None };
        let volts = answer.potentials[self.branches[n].from] - answer.potentials[self.branches[n].to];
        let amps = answer.currents[n];
        let slack = 1e-9 * (1.0 + volts.abs());
        match answer.states[n] {
            State::Conducting => (amps < -1e-11).then_some(State::Blocking),
            State::Breakdown => (amps > 1e-11).then_some(State::Blocking),
            State::Blocking if volts > drop + slack => Some(State::Conducting),
            State::Blocking => breakdown.filter(|b| volts < -b - slack).map(|_| State::Breakdown),
        }
    }

    fn solve(&self, states: &[State], past: Option<(&Answer, f64)>) -> Option<Answer> {
        let size = self.nodes - 1 + self.branches.len();
        let mut rows = vec![vec![0.0; size + 1]; size];
        let column = |node: usize| node.checked_sub(1);
        for node in 1..self.nodes {
            rows[node - 1][node - 1] = LEAK;
        }
        for (n, branch) in self.branches.iter().enumerate() {
            let own = self.nodes - 1 + n;
            if let Some(c) = column(branch.from) {
                rows[c][own] += 1.0;
            }
            if let Some(c) = column(branch.to) {
                rows[c][own] -= 1.0;
            }
            let row = &mut rows[own];
            let volts = |row: &mut Vec<f64>, from: usize, to: usize, factor: f64| {
                if let Some(c) = column(from) {
                    row[c] += factor;
                }
                if let Some(c) = column(to) {
                    row[c] -= factor;
                }
            };
            let across = |a: &Answer| a.potentials[branch.from] - a.potentials[branch.to];
            match (&branch.law, past) {
                (Law::R(ohms), _) => {
                    volts(row, branch.from, branch.to, 1.0);
                    row[own] -= ohms;
                }
                (Law::V(v), _) => {
                    volts(row, branch.from, branch.to, 1.0);
                    row[size] = *v;
                }
                (Law::I(i), _) => {
                    row[own] = 1.0;
                    row[size] = *i;
                }
                (Law::D { drop, breakdown, series }, _) => {
                    let series = series + BULK;
                    match states[n] {
                        State::Blocking => row[own] = 1.0,
                        state => {
                            volts(row, branch.from, branch.to, 1.0);
                            row[own] -= series;
                            row[size] =
                                if state == State::Conducting { *drop } else { -breakdown.unwrap_or(1e9) };
                        }
                    }
                }
                (Law::C(_), None) => row[own] = 1.0,
                (Law::C(farads), Some((before, h))) => {
                    volts(row, branch.from, branch.to, farads / h);
                    row[own] = -1.0;
                    row[size] = farads / h * across(before);
                }
                (Law::L(_), None) => volts(row, branch.from, branch.to, 1.0),
                (Law::L(henries), Some((before, h))) => {
                    volts(row, branch.from, branch.to, 1.0);
                    row[own] -= henries / h;
                    row[size] -= henries / h * before.currents[n];
                    for &(a, b, m) in &self.mutual {
                        let other = if a == n { b } else { a };
                        if a == n || b == n {
                            row[self.nodes - 1 + other] -= m / h;
                            row[size] -= m / h * before.currents[other];
                        }
                    }
                }
                (Law::E(gain, c, d), _) => {
                    volts(row, branch.from, branch.to, 1.0);
                    volts(row, *c, *d, -gain);
                }
                (Law::G(gain, c, d), _) => {
                    row[own] = 1.0;
                    volts(row, *c, *d, -gain);
                }
                (Law::F(gain, heard), _) => {
                    row[own] = 1.0;
                    row[self.nodes - 1 + heard] -= gain;
                }
                (Law::H(gain, heard), _) => {
                    volts(row, branch.from, branch.to, 1.0);
                    row[self.nodes - 1 + heard] -= gain;
                }
            }
        }
        let x = eliminate(rows)?;
        let mut potentials = vec![0.0];
        potentials.extend(&x[..self.nodes - 1]);
        Some(Answer { potentials, currents: x[self.nodes - 1..].to_vec(), states: states.to_vec() })
    }
}

/// The state that the current tells.
pub fn real_state(answer: &Answer, branch: usize) -> State {
    match answer.currents[branch] {
        i if i > NOTHING && answer.states[branch] == State::Conducting => State::Conducting,
        i if i < -NOTHING && answer.states[branch] == State::Breakdown => State::Breakdown,
        _ => State::Blocking,
    }
}

/// Gaussian elimination with row pivoting; rows carry their right side.
fn eliminate(mut rows: Vec<Vec<f64>>) -> Option<Vec<f64>> {
    let size = rows.len();
    for k in 0..size {
        let best = (k..size).max_by(|&a, &b| rows[a][k].abs().total_cmp(&rows[b][k].abs()))?;
        rows.swap(k, best);
        let (upper, lower) = rows.split_at_mut(k + 1);
        let pivot = &upper[k];
        if pivot[k].abs() < 1e-14 {
            return None;
        }
        for row in lower.iter_mut().filter(|r| r[k] != 0.0) {
            let factor = row[k] / pivot[k];
            for (x, p) in row[k..].iter_mut().zip(&pivot[k..]) {
                *x -= factor * p;
            }
        }
    }
    let mut x = vec![0.0; size];
    for k in (0..size).rev() {
        let sum: f64 = (k + 1..size).map(|j| rows[k][j] * x[j]).sum();
        x[k] = (rows[k][size] - sum) / rows[k][k];
    }
    x.iter().all(|v| v.is_finite()).then_some(x)
}
