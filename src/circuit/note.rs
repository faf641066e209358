//! Notes (`*@ …` comment lines) as data. Reading them is `syntax`'s; acting on them is later stages'.

use super::behaviour::Value;
use super::ids::{ScopeId, Symbol};
use crate::text::Span;

/// A note and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct Note {
    /// The circuit or subcircuit instance where it stands; it holds there and below.
    pub scope: ScopeId,
    /// The whole comment line from `*@` on.
    pub span: Span,
    /// The name it is about, as written (an element, a model, a path `X1:D3`, a node); empty where it has none.
    pub subject: Symbol,
    /// Where that name stands.
    pub subject_span: Span,
    /// What it says.
    pub kind: NoteKind,
}

/// A state of a diode, as notes, marks and results name it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum State {
    /// Carries forward current.
    Conducting,
    /// Carries none.
    Blocking,
    /// Carries reverse current at its breakdown voltage.
    Breakdown,
    /// The model leaves even the direction open.
    Open,
    /// Could not be reached.
    NotEvaluated,
}

impl State {
    /// The word used in every output.
    pub fn word(self) -> &'static str {
        match self {
            State::Conducting => "conducting",
            State::Blocking => "blocking",
            State::Breakdown => "breakdown",
            State::Open => "open",
            State::NotEvaluated => "not evaluated",
        }
    }
}

/// What a note says. Later issues act on more of them; all are read.
#[derive(Debug, Clone, PartialEq)]
pub enum NoteKind {
    /// `drop D1 0.65`, volts.
    Drop(Value),
    /// `made-of DRED red-led`: the material's word.
    MadeOf(String),
    /// `supply +12V 12 [9..16]`: volts, and the range.
    Supply { volts: Value, range: Option<(f64, f64)> },
    /// `range VIN 9 16`, or `range VIN 12 5%` (already turned into two ends).
    Range { from: f64, to: f64 },
    /// `hold Q1 on|off|both`.
    Hold(Hold),
    /// `expect …`, kept as its parts.
    Expect(Expectation),
    /// `watch out`, or `watch a b`: the second node. `watch out ripple < 0.5`: volts peak to peak that it may have.
    Watch { other: Option<Symbol>, ripple: Option<Value> },
    /// `matched D1 D2 …`: the others.
    Matched(Vec<Symbol>),
    /// `rating D1 i=200m vr=75 p=500m`: lower-case keys, SI units.
    Rating(Vec<(String, f64)>),
    /// `accept RULE SUBJECT because …`: rule and reason.
    Accept { rule: String, reason: Option<String> },
}

/// How a transistor or switch is held.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Hold {
    /// Main path joined.
    On,
    /// Main path open.
    Off,
    /// Each in a condition of its own.
    Both,
}

/// What an `expect` note asks for.
#[derive(Debug, Clone, PartialEq)]
pub struct Expectation {
    /// The state of the diode, where one is asked for.
    pub state: Option<State>,
    /// `v(node)` rather than a diode.
    pub is_voltage: bool,
    /// The range of the current's magnitude or of the voltage, where given.
    pub range: Option<(f64, f64)>,
    /// `at nominal`, `at VIN=9`: the condition's name.
    pub at: Option<String>,
    /// `in some condition`.
    pub some: bool,
    /// `over time`.
    pub over_time: bool,
}
