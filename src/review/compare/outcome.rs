//! What a comparison tells, as plain data in SI units, names as in the new revision.

use super::super::record::Record;
use crate::operating::{State, Trust, Verdict};

/// Everything that differs between two revisions.
#[derive(Debug, Clone, Default)]
pub struct Comparison {
    /// Diodes whose state flips, in the order of the text.
    pub states: Vec<StateChange>,
    /// Currents that move.
    pub currents: Vec<Move>,
    /// Voltages that move.
    pub voltages: Vec<Move>,
    /// Conditions whose verdict changes, that come or go.
    pub verdicts: Vec<VerdictChange>,
    /// Diodes whose trust changes.
    pub trust: Vec<TrustChange>,
    /// Findings that come, go and stay.
    pub findings: FindingsChange,
    /// Elements that come, go, or are connected otherwise.
    pub wiring: Vec<WiringChange>,
}

impl Comparison {
    /// Whether nothing at all differs.
    pub fn is_empty(&self) -> bool {
        self.states.is_empty()
            && self.currents.is_empty()
            && self.voltages.is_empty()
            && self.verdicts.is_empty()
            && self.trust.is_empty()
            && self.findings.new.findings.is_empty()
            && self.findings.gone.findings.is_empty()
            && self.wiring.is_empty()
    }
}

/// A state that flips in one condition.
#[derive(Debug, Clone, PartialEq)]
pub struct StateChange {
    /// The diode's full name.
    pub diode: String,
    /// The condition.
    pub case: String,
    /// State before; `None` where several consistent sets disagree.
    pub old: Option<State>,
    /// State now.
    pub new: Option<State>,
    /// Current before, amperes, anode to cathode; `None` where it is open or not evaluated.
    pub old_current: Option<f64>,
    /// Current now.
    pub new_current: Option<f64>,
    /// Why it is no longer in its old state, in one line; may be empty.
    pub why: String,
}

/// A current or voltage that moves in one condition.
#[derive(Debug, Clone, PartialEq)]
pub struct Move {
    /// Name of the element or node.
    pub name: String,
    /// The condition.
    pub case: String,
    /// Amperes or volts before.
    pub old: f64,
    /// Amperes or volts now.
    pub new: f64,
}

/// A verdict that changes; `None` where the condition is not examined.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct VerdictChange {
    /// The condition.
    pub case: String,
    /// Before.
    pub old: Option<Verdict>,
    /// Now.
    pub new: Option<Verdict>,
}

/// The trust in a diode's numbers, which changes in one condition.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TrustChange {
    /// The diode's full name.
    pub diode: String,
    /// The condition.
    pub case: String,
    /// Before.
    pub old: Trust,
    /// Now.
    pub new: Trust,
}

/// Findings of both revisions.
#[derive(Debug, Clone, Default)]
pub struct FindingsChange {
    /// The new revision, its findings those that the old one does not have.
    pub new: Record,
    /// The old revision, its findings those that the new one does not have.
    pub gone: Record,
    /// How many both have.
    pub kept: usize,
}

/// An element that comes, goes, or is connected otherwise.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct WiringChange {
    /// Its full name; in the new revision where it is there.
    pub element: String,
    /// What happened, as the rest of a sentence: `is gone; it joined in to out`.
    pub what: String,
}
