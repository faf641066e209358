//! The equations as plain data, and the matrix and right-hand side of one implicit stage.

/// A sum over unknowns, inputs and a constant.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct Affine {
    /// Unknown and its factor.
    pub unknowns: Vec<(u32, f64)>,
    /// Input and its factor.
    pub inputs: Vec<(u32, f64)>,
    /// The rest.
    pub constant: f64,
}

impl Affine {
    /// `self − other`.
    pub fn minus(&self, other: &Affine) -> Affine {
        let join = |a: &[(u32, f64)], b: &[(u32, f64)]| {
            let mut all: Vec<(u32, f64)> = a.to_vec();
            for &(n, factor) in b {
                match all.iter_mut().find(|(known, _)| *known == n) {
                    Some((_, sum)) => *sum -= factor,
                    None => all.push((n, -factor)),
                }
            }
            all.retain(|(_, factor)| *factor != 0.0);
            all
        };
        Affine {
            unknowns: join(&self.unknowns, &other.unknowns),
            inputs: join(&self.inputs, &other.inputs),
            constant: self.constant - other.constant,
        }
    }

    /// Its value.
    pub fn at(&self, unknowns: &[f64], inputs: &[f64]) -> f64 {
        self.given(inputs) + self.unknowns.iter().map(|&(n, f)| f * unknowns[n as usize]).sum::<f64>()
    }

    /// Its part that does not depend on unknowns.
    fn given(&self, inputs: &[f64]) -> f64 {
        self.constant + self.inputs.iter().map(|&(n, f)| f * inputs[n as usize]).sum::<f64>()
    }
}

/// Storage: what remembers.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Cell {
    /// i = C·dv/dt; its state is the voltage.
    Capacitance { farads: f64, across: Affine },
    /// v = Σ M·di/dt over cells; its state is the current, an unknown of its own whose row holds its voltage law.
    Inductance { current: u32, flux: Vec<(u32, f64)> },
}

/// What is assumed of a junction.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(crate) enum Mode {
    /// Carries nothing.
    Blocking,
    /// Inner voltage at `forward`.
    Forward,
    /// Inner voltage at `−reverse`.
    Reverse,
}

/// A junction with a current of its own.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct StepJunction {
    /// Unknown that is its current; its row is the junction's law.
    pub current: u32,
    /// Voltage at its terminals.
    pub across: Affine,
    /// Inner voltage while it conducts.
    pub forward: f64,
    /// Magnitude of the inner voltage in breakdown; infinite where there is none.
    pub reverse: f64,
    /// Resistance in series.
    pub series: f64,
}

/// A conductance with two values; which one holds is set from outside, between segments.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Gate {
    /// Its voltage.
    pub across: Affine,
    /// Conductance while closed, and while open.
    pub conductance: [f64; 2],
}

/// A system. Unknowns are potentials and currents; row `n` belongs to unknown `n`: the current law of a potential,
/// the voltage law of a current.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct System {
    /// Whether each unknown is a current.
    pub is_current: Vec<bool>,
    /// Number of inputs.
    pub inputs: usize,
    /// Row, column, value of everything that never changes.
    pub entries: Vec<(u32, u32, f64)>,
    /// Row, input, factor on the right-hand side.
    pub drive: Vec<(u32, u32, f64)>,
    /// Row and value on the right-hand side.
    pub constant: Vec<(u32, f64)>,
    /// Storage.
    pub cells: Vec<Cell>,
    /// Junctions.
    pub junctions: Vec<StepJunction>,
    /// Gates.
    pub gates: Vec<Gate>,
    /// Some law is not mutual, so the matrix is not symmetric.
    pub one_sided: bool,
}

/// Conductance of a blocking junction, siemens: it shares a voltage among junctions in series and carries next to
/// nothing.
pub(super) const LEAK: f64 = 1e-15;

/// Resistance of whatever has none, ohms: it shares a current among equals and drops next to nothing.
pub(crate) const BARE: f64 = 1e-9;

/// Conductance that ties a loose set of nodes to the reference, siemens.
pub(crate) const TIE: f64 = 1e-18;

impl System {
    /// Number of unknowns.
    pub fn unknowns(&self) -> usize {
        self.is_current.len()
    }

    /// All entries of the matrix of a stage of length `g`, in an order that never changes; `g` may
    /// differ from cell to cell.
    pub(super) fn entries(
        &self,
        modes: &[Mode],
        closed: &[bool],
        g: &dyn Fn(usize) -> f64,
        mut add: impl FnMut(u32, u32, f64),
    ) {
        for &(row, col, value) in &self.entries {
            add(row, col, value);
        }
        let mut square = |across: &Affine, weight: f64| {
            for &(row, a) in &across.unknowns {
                for &(col, b) in &across.unknowns {
                    add(row, col, weight * a * b);
                }
            }
        };
        for (gate, &closed) in self.gates.iter().zip(closed) {
            square(&gate.across, gate.conductance[usize::from(!closed)]);
        }
        for (n, cell) in self.cells.iter().enumerate() {
            if let Cell::Capacitance { farads, across } = cell {
                square(across, farads / g(n));
            }
        }
        for (n, cell) in self.cells.iter().enumerate() {
            if let Cell::Inductance { current, flux } = cell {
                for &(other, henries) in flux {
                    if let Some(Cell::Inductance { current: col, .. }) = self.cells.get(other as usize) {
                        add(*current, *col, -henries / g(n));
                    }
                }
            }
        }
        for (junction, mode) in self.junctions.iter().zip(modes) {
            let ohms = if *mode == Mode::Blocking { 1.0 / LEAK } else { junction.series + BARE };
            add(junction.current, junction.current, -ohms);
        }
    }

    /// Right-hand side of a stage of length `g` that starts from the states `from`.
    pub(super) fn right_side(
        &self,
        modes: &[Mode],
        closed: &[bool],
        g: &dyn Fn(usize) -> f64,
        from: &[f64],
        inputs: &[f64],
        out: &mut [f64],
    ) {
        out.fill(0.0);
        for &(row, value) in &self.constant {
            out[row as usize] += value;
        }
        for &(row, input, factor) in &self.drive {
            out[row as usize] += factor * inputs[input as usize];
        }
        for (gate, &closed) in self.gates.iter().zip(closed) {
            let pushed = gate.conductance[usize::from(!closed)] * gate.across.given(inputs);
            for &(row, factor) in &gate.across.unknowns {
                out[row as usize] -= factor * pushed;
            }
        }
        for (n, (cell, &state)) in self.cells.iter().zip(from).enumerate() {
            match cell {
                Cell::Capacitance { farads, across } => {
                    let pushed = farads / g(n) * (state - across.given(inputs));
                    for &(row, factor) in &across.unknowns {
                        out[row as usize] += factor * pushed;
                    }
                }
                Cell::Inductance { current, flux } => {
                    let linked: f64 =
                        flux.iter().map(|&(other, henries)| henries * from[other as usize]).sum();
                    out[*current as usize] -= linked / g(n);
                }
            }
        }
        for (junction, mode) in self.junctions.iter().zip(modes) {
            let level = match mode {
                Mode::Blocking => 0.0,
                Mode::Forward => junction.forward,
                Mode::Reverse => -junction.reverse,
            };
            out[junction.current as usize] += level - junction.across.given(inputs);
        }
    }

    /// The states of the cells from the unknowns.
    pub(super) fn states(&self, unknowns: &[f64], inputs: &[f64], out: &mut [f64]) {
        for (state, cell) in out.iter_mut().zip(&self.cells) {
            *state = match cell {
                Cell::Capacitance { across, .. } => across.at(unknowns, inputs),
                Cell::Inductance { current, .. } => unknowns[*current as usize],
            };
        }
    }
}
