//! The results as plain data, in SI units. Voltages and currents of a diode count from anode to cathode.

use super::basis::Basis;
use crate::circuit::{ElementId, NodeId, State};
use crate::complementarity::{Quantity, Verdict, View};

/// Everything found about the operating point.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Operating {
    /// One for each condition, nominal first.
    pub cases: Vec<Case>,
    /// Diodes in parts that a moving source reaches through a capacitor, an inductor or a coupling, in order:
    /// the operating point says nothing final about them, so rules of the kind "never" leave them out.
    pub left_to_time: Vec<ElementId>,
    /// Nodes in such parts, in order.
    pub nodes_left_to_time: Vec<NodeId>,
    /// The reasoning about the diode that `--why` asks about.
    pub why: Option<Why>,
    /// The model that the time pass takes over.
    pub(crate) basis: Option<Box<Basis>>,
}

/// Why a diode is in its state.
#[derive(Debug, Clone, PartialEq)]
pub struct Why {
    /// The diode.
    pub element: ElementId,
    /// One for each line of reasoning; conditions that share one stand together.
    pub reasonings: Vec<Reasoning>,
}

/// One line of reasoning.
#[derive(Debug, Clone, PartialEq)]
pub struct Reasoning {
    /// Names of the conditions in which it holds.
    pub cases: Vec<String>,
    /// The state.
    pub state: State,
    /// Whole sentences, in order: assumptions, what follows from them, the margin.
    pub sentences: Vec<String>,
    /// Source values that alone would change the state, nearest (relative to the source's value) first.
    pub flips: Vec<Flip>,
    /// The search for such a value, in one sentence.
    pub flip_sentence: String,
}

/// A source value at which the state changes, every other source keeping its own.
#[derive(Debug, Clone, PartialEq)]
pub struct Flip {
    /// Name of the source, or of the node that a `supply` note holds.
    pub source: String,
    /// In amperes rather than volts.
    pub is_current: bool,
    /// What it is now, volts or amperes.
    pub from: f64,
    /// Where the state changes.
    pub to: f64,
    /// The state beyond; `NotEvaluated` where nothing consistent is beyond.
    pub state: State,
}

/// One condition and what holds in it.
#[derive(Debug, Clone, PartialEq)]
pub struct Case {
    /// `nominal`, `VIN=9`, `V1=max`.
    pub name: String,
    /// Independent sources and their values, volts or amperes, in the order of the text.
    pub sources: Vec<(ElementId, f64)>,
    /// Nodes that `supply` notes hold, and their volts.
    pub supplies: Vec<(NodeId, f64)>,
    /// One of the two instants of a moving source; diodes of [`Operating::left_to_time`] are not judged here.
    pub instant: bool,
    /// Degrees Celsius.
    pub temperature: f64,
    /// The most serious of the parts' verdicts.
    pub verdict: Verdict,
    /// What makes the verdict other than unique, one for each cause.
    pub causes: Vec<Cause>,
    /// More solutions exist than are listed.
    pub truncated: bool,
    /// Factorizations done.
    pub solves: usize,
    /// How well the solutions satisfy the circuit laws.
    pub residual: Residual,
    /// Every consistent set; empty only where nothing could be solved.
    pub solutions: Vec<Solution>,
}

/// A cause: which loop, cut set, unknown elements or residual.
#[derive(Debug, Clone, PartialEq)]
pub struct Cause {
    /// The verdict it leads to.
    pub verdict: Verdict,
    /// In words with numbers: `V1, D1 and D2 form a loop …`.
    pub text: String,
    /// The elements concerned, in the order of the loop or cut set.
    pub elements: Vec<ElementId>,
    /// Whether it only shows that one instant cannot judge: a moving source, or a switch that is held on, meets an
    /// inductor, which an instant taken by itself sees as a short circuit.
    pub left_to_time: bool,
}

/// Largest absolute misses of the laws.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Residual {
    /// Of Kirchhoff's current law and current laws, amperes.
    pub current: f64,
    /// Of voltage laws, volts.
    pub voltage: f64,
    /// The larger of both as a share of the largest term at its node or loop.
    pub relative: f64,
}

/// One consistent set of everything.
#[derive(Debug, Clone, PartialEq)]
pub struct Solution {
    /// All diodes in the order of the text.
    pub diodes: Vec<DiodeResult>,
    /// All nodes but ground, in order.
    pub nodes: Vec<NodeResult>,
    /// Every other two-terminal element that is evaluated (R L V I E F G H).
    pub branches: Vec<BranchResult>,
    /// Differences of potentials that matter: watched, listened to, or across a resistor between two diodes.
    pub differences: Vec<DifferenceResult>,
    /// Parts in which the second opinion was sought and not found.
    pub unrefined: Vec<Unrefined>,
}

/// Where a drop comes from.
#[derive(Debug, Clone, PartialEq)]
pub enum DropOrigin {
    /// `--drop`.
    Option,
    /// A `drop` note.
    Note,
    /// IS and N of the model at a decade of current in amperes: `model DSIG at 10mA`.
    Model { model: String, decade: f64 },
    /// A `made-of` note.
    Material(&'static str),
    /// Silicon, since nothing else is said.
    Default,
}

impl std::fmt::Display for DropOrigin {
    /// `option`, `note`, `model DSIG at 10mA`, `material red-led`, `default`.
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            DropOrigin::Option => f.write_str("option"),
            DropOrigin::Note => f.write_str("note"),
            DropOrigin::Model { model, decade } => {
                write!(f, "model {model} at {}", crate::finding::compact(*decade, "A"))
            }
            DropOrigin::Material(material) => write!(f, "material {material}"),
            DropOrigin::Default => f.write_str("default"),
        }
    }
}

/// The constant drop of a diode.
#[derive(Debug, Clone, PartialEq)]
pub struct Drop {
    /// Volts at the case's temperature, series resistance not included.
    pub volts: f64,
    /// Whether it is a written number.
    pub written: bool,
    /// Where it comes from.
    pub origin: DropOrigin,
}

/// One diode in one solution.
#[derive(Debug, Clone, PartialEq)]
pub struct DiodeResult {
    /// The element.
    pub element: ElementId,
    /// Its state.
    pub state: State,
    /// Why it was not evaluated, where so.
    pub not_evaluated: Option<String>,
    /// It was not evaluated because its part holds something whose law is not known.
    pub unmodelled: bool,
    /// At its terminals, series resistance included.
    pub voltage: Quantity,
    /// From anode to cathode.
    pub current: Quantity,
    /// Dissipated, watts; where voltage and current are known.
    pub power: Option<f64>,
    /// Its drop.
    pub drop: Drop,
    /// Breakdown voltage of the model, a magnitude.
    pub breakdown: Option<f64>,
    /// Series resistance, ohms.
    pub series: f64,
    /// What it sees of the rest, where finite.
    pub view: Option<View>,
    /// Distance from the open-circuit voltage to the nearest level that would change the state, positive where
    /// the state holds.
    pub margin: Option<f64>,
    /// How soft its knee is; `None` for an ideal diode (drop under 0.1 V).
    pub knee: Option<Knee>,
    /// How far the numbers above may be believed; `None` where it was not evaluated or not looked at.
    pub trust: Option<Trust>,
    /// What is wrong with them, in words and numbers; empty where trust is good.
    pub trust_reasons: Vec<String>,
    /// Error bar of the current; `None` where none could be had.
    pub error: Option<ErrorBar>,
    /// The second opinion; `None` where the exponential law leaves it open or was not solved.
    pub refined: Option<Refined>,
}

/// How far the constant-drop answer may be believed at a diode.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Trust {
    /// Poor: the current may be off by more than a fifth, or the state is in doubt.
    Poor,
    /// Fair: within a fifth.
    Fair,
    /// Good.
    Good,
}

impl Trust {
    /// The word used in every output.
    pub fn word(self) -> &'static str {
        match self {
            Trust::Good => "good",
            Trust::Fair => "fair",
            Trust::Poor => "poor",
        }
    }
}

/// The exponential law of a junction beside its constant drop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Knee {
    /// N·kT/q, volts for each factor e of current.
    pub slope: f64,
    /// Current at which the junction has its drop, amperes; by its law, else by its material's.
    pub reference: f64,
    /// Whether the model's IS says so, rather than the material.
    pub is_known: bool,
    /// How far the drop may be off at the current found (at breakdown: the breakdown voltage), volts.
    pub uncertainty: f64,
}

/// A first-order error bar: what the uncertainty of all drops and the leakage of all blocking diodes do to one
/// quantity, worst case. Nothing in it comes from the second opinion.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ErrorBar {
    /// Half its width in amperes; for a blocking diode the most that it may leak, a magnitude.
    pub current: f64,
    /// The same for its voltage, volts.
    pub voltage: f64,
    /// The diode that contributes most, and its part in `current` (blocking: in `voltage`).
    pub most: Option<(ElementId, f64)>,
}

/// The second opinion: the exponential law on the whole part.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Refined {
    /// At its terminals, series resistance included.
    pub voltage: f64,
    /// From anode to cathode.
    pub current: f64,
}

/// Why a difference of potentials matters.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum DifferenceOf {
    /// A note watches it.
    Watched,
    /// This source listens to it.
    Control(ElementId),
    /// It is across this resistor, both of whose ends diodes pin.
    Resistor(ElementId),
}

/// A difference of two potentials.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DifferenceResult {
    /// Why it matters.
    pub of: DifferenceOf,
    /// The first node.
    pub from: NodeId,
    /// The second.
    pub to: NodeId,
    /// Potential of the first minus that of the second, volts.
    pub voltage: f64,
    /// Half the width of its error bar, volts.
    pub error: f64,
    /// By the exponential law, volts; where that was solved.
    pub refined: Option<f64>,
}

/// Diodes for which the exponential law gave no answer though it was sought.
#[derive(Debug, Clone, PartialEq)]
pub struct Unrefined {
    /// The diodes of one part.
    pub diodes: Vec<ElementId>,
    /// Why, in a few words: `it did not converge`.
    pub reason: &'static str,
}

/// One node in one solution.
#[derive(Debug, Clone, PartialEq)]
pub struct NodeResult {
    /// The node.
    pub node: NodeId,
    /// Against ground.
    pub voltage: Quantity,
    /// Half the width of its error bar, volts; for nodes that a `watch` note names.
    pub error: Option<f64>,
    /// By the exponential law, volts; where that was solved.
    pub refined: Option<f64>,
}

/// One other element in one solution.
#[derive(Debug, Clone, PartialEq)]
pub struct BranchResult {
    /// The element.
    pub element: ElementId,
    /// From first to second node through it.
    pub current: Quantity,
}
