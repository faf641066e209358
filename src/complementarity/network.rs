//! The problem: nodes, branches, and the law of each branch.

/// A number on a right-hand side, and whether its shortest decimal form is exactly what was meant. Sums of
/// exact levels are compared as decimals (three times 0.7 is 2.1), others to 1e-12 of the largest term.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Level {
    /// The number.
    pub value: f64,
    /// Written, not computed.
    pub exact: bool,
}

/// A junction with a series resistance. Current counts from `from` (anode) to `to`; the inner voltage is
/// `v − series·i`, and it obeys: conducting at `forward` with i > 0, or i = 0 between `−reverse` and
/// `forward`, or i < 0 at `−reverse`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Junction {
    /// Inner voltage while conducting, ≥ 0.
    pub forward: Level,
    /// Magnitude of the inner voltage in breakdown, > 0; `None` never breaks down.
    pub reverse: Option<Level>,
    /// Resistance in series, ≥ 0.
    pub series: f64,
}

/// What a controlled law listens to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Control {
    /// Potential of the first node minus that of the second.
    Voltage(u32, u32),
    /// Current of a branch by its number.
    Current(u32),
}

/// The law of a branch; `v` is the potential of `from` minus that of `to`, `i` flows from `from` to `to`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Law {
    /// v = r·i with r ≠ 0; negative is allowed.
    Resistance(f64),
    /// v = level.
    Voltage(Level),
    /// i = level.
    Current(Level),
    /// Piecewise linear, see [`Junction`].
    Junction(Junction),
    /// v = gain·control.
    VoltageControlled(f64, Control),
    /// i = gain·control.
    CurrentControlled(f64, Control),
    /// Short of zero resistance that is not a source: an inductor or 0 Ω.
    Short,
    /// Not known. The parts it touches are not evaluated. An element with many pins is a star of such branches.
    Unknown,
}

/// One branch.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Branch {
    /// Node it leaves.
    pub from: u32,
    /// Node it enters.
    pub to: u32,
    /// What it obeys.
    pub law: Law,
}

/// A whole problem. Node 0 is the reference, with potential 0. Open circuits (capacitors) are no branches.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Network {
    /// Number of nodes, the reference included.
    pub nodes: u32,
    /// The branches.
    pub branches: Vec<Branch>,
}
