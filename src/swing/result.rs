//! What the time pass and the conditions tell about each diode and node, as plain data in SI units. Currents and
//! voltages of a diode count from anode to cathode.

use crate::circuit::{ElementId, NodeId, State};

/// Everything found over time and over the conditions.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Swing {
    /// Seconds that were looked at; `None` where nothing moves.
    pub span: Option<f64>,
    /// Common period of the moving sources in seconds; `None` where they have none, and the figures then hold for
    /// the whole span.
    pub period: Option<f64>,
    /// Time at which the window begins that the figures and waves hold for: the last period, or the whole span.
    pub start: f64,
    /// Length of that window in seconds; 0 where nothing moves.
    pub window: f64,
    /// Whether the window repeats itself: every part that was followed ends it as it began it.
    pub periodic: bool,
    /// Why the run was cut short, or did not reach the periodic state, where so; a whole sentence.
    pub cut_short: Option<String>,
    /// One for each diode, in the order of the text.
    pub diodes: Vec<DiodeSwing>,
    /// One for each node but ground, in order.
    pub nodes: Vec<NodeSwing>,
    /// Waveforms of the nodes that notes watch, over the window.
    pub waves: Vec<Wave>,
    /// What it took.
    pub effort: Effort,
}

impl Swing {
    /// The figures of one diode.
    pub fn diode(&self, element: ElementId) -> Option<&DiodeSwing> {
        self.diodes.binary_search_by_key(&element, |d| d.element).ok().map(|at| &self.diodes[at])
    }

    /// The figures of one node.
    pub fn node(&self, node: NodeId) -> Option<&NodeSwing> {
        self.nodes.binary_search_by_key(&node, |n| n.node).ok().map(|at| &self.nodes[at])
    }
}

/// One diode.
#[derive(Debug, Clone, PartialEq)]
pub struct DiodeSwing {
    /// The element.
    pub element: ElementId,
    /// Over the window; `None` where nothing moves, or where it could not be evaluated.
    pub over_time: Option<OverTime>,
    /// Why it was not evaluated over time, where so.
    pub not_evaluated: Option<String>,
    /// Forward current over the conditions; `None` where it conducts in none.
    pub over_conditions: Option<OverConditions>,
}

/// A diode over the window.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct OverTime {
    /// Share of the window in which it conducts, 0 to 1.
    pub conducting_share: f64,
    /// Intervals of forward conduction in seconds from the start of the window; the second end lies past the
    /// window's end where one wraps round.
    pub intervals: Vec<(f64, f64)>,
    /// Intervals of breakdown, likewise.
    pub breakdown_intervals: Vec<(f64, f64)>,
    /// Mean current, amperes; breakdown counts negative.
    pub current_mean: f64,
    /// Effective current, amperes.
    pub current_rms: f64,
    /// Largest forward current, amperes.
    pub current_peak: f64,
    /// Largest breakdown current, a magnitude in amperes.
    pub reverse_peak: f64,
    /// Currents between which 5 % and 95 % of the forward charge flow; `None` where none flows.
    pub charge_span: Option<(f64, f64)>,
    /// Decades between the two.
    pub decades: Option<f64>,
    /// Largest voltage from cathode to anode, volts, 0 or more.
    pub peak_reverse_voltage: f64,
    /// Energy dissipated in the window, joules, series resistance included.
    pub energy: f64,
    /// Largest forward charge that passes in no time, coulombs: where nothing limits the current at a jump.
    pub impulse: f64,
}

/// Less than this share of the window is rounding.
const ROUNDING: f64 = 1e-9;

impl OverTime {
    /// The states that are reached in a window of so many seconds, in the order of [`State`].
    pub fn states(&self, window: f64) -> Vec<State> {
        let broken: f64 = self.breakdown_intervals.iter().map(|(from, to)| to - from).sum();
        let broken = if window > 0.0 { broken / window } else { 0.0 };
        let reached = [
            (State::Conducting, self.conducting_share > 0.0),
            (State::Blocking, self.conducting_share + broken < 1.0 - ROUNDING),
            (State::Breakdown, broken > 0.0),
        ];
        reached.into_iter().filter(|(_, is)| *is).map(|(state, _)| state).collect()
    }
}

/// Forward current of a diode over the conditions in which it conducts.
#[derive(Debug, Clone, PartialEq)]
pub struct OverConditions {
    /// Least forward current while conducting, amperes.
    pub min: f64,
    /// Greatest.
    pub max: f64,
    /// The condition of the least.
    pub min_case: String,
    /// The condition of the greatest.
    pub max_case: String,
}

/// One node against ground over the window.
#[derive(Debug, Clone, PartialEq)]
pub struct NodeSwing {
    /// The node.
    pub node: NodeId,
    /// `None` where nothing moves, or where it could not be evaluated.
    pub over_time: Option<Level>,
}

/// Mean and extremes of a potential, volts.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Level {
    /// Mean.
    pub mean: f64,
    /// Least.
    pub min: f64,
    /// Greatest.
    pub max: f64,
}

impl Level {
    /// Peak to peak, volts.
    pub fn ripple(self) -> f64 {
        self.max - self.min
    }
}

/// A waveform: seconds from the start of the window, and volts.
#[derive(Debug, Clone, PartialEq)]
pub struct Wave {
    /// The node.
    pub node: NodeId,
    /// Time and value, ascending in time.
    pub points: Vec<(f64, f64)>,
}

/// What a run took, over all parts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Effort {
    /// Steps that were kept.
    pub steps: u64,
    /// Steps that were tried and made anew with a shorter one.
    pub rejected: u64,
    /// Factorizations.
    pub factorizations: u64,
    /// Periods walked through until the periodic state, the recorded one included.
    pub periods: u64,
    /// Steps in the recorded window.
    pub window_steps: u64,
    /// Factorizations in the recorded window.
    pub window_factorizations: u64,
}
