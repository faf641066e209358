//! What elements do, as numbers in SI units, each number with the place where it was written.

use super::ids::{ElementId, ModelId, Symbol};
use crate::text::Span;

/// A number and where it comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Value {
    /// In SI units.
    pub number: f64,
    /// Written as a decimal number in the text (then its shortest decimal form is exact), not computed by an
    /// expression.
    pub written: bool,
    /// Where the number was written (not where it was used).
    pub span: Span,
}

/// How a source moves over time; all in SI units. Absent parameters have been filled with their defaults.
#[derive(Debug, Clone, PartialEq)]
pub enum Shape {
    /// `SIN(offset amplitude frequency delay damping phase)`, phase in degrees.
    Sine { offset: f64, amplitude: f64, frequency: f64, delay: f64, damping: f64, phase: f64 },
    /// `PULSE(v1 v2 delay rise fall width period)`.
    Pulse { low: f64, high: f64, delay: f64, rise: f64, fall: f64, width: f64, period: f64 },
    /// `PWL(t v …)`, times ascending.
    Points(Vec<(f64, f64)>),
    /// `PWL(t v …) r=from`: the course from `from` to the last time, over and over; `from` is before the last time.
    Repeated { points: Vec<(f64, f64)>, from: f64 },
    /// `EXP(v1 v2 delay1 tau1 delay2 tau2)`.
    Exponential { low: f64, high: f64, delay1: f64, tau1: f64, delay2: f64, tau2: f64 },
    /// `SFFM(offset amplitude carrier index signal)`.
    Modulated { offset: f64, amplitude: f64, carrier: f64, index: f64, signal: f64 },
}

/// An independent source, in volts or amperes.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Source {
    /// The DC value, given with the word or bare.
    pub dc: Option<Value>,
    /// Magnitude given after `AC`.
    pub ac: Option<f64>,
    /// How it moves.
    pub shape: Option<Shape>,
}

/// What an element does between its nodes. Pins in the order of the line.
#[derive(Debug, Clone, PartialEq)]
pub enum Behaviour {
    /// Ohms; 0 is a 0 V source; may be negative.
    Resistor(Value),
    /// Farads; initial voltage where given.
    Capacitor { farads: Value, initial: Option<f64> },
    /// Henries; initial current where given.
    Inductor { henries: Value, initial: Option<f64> },
    /// Coupling of two or more inductors; it has no pins.
    Coupling { coils: Box<[ElementId]>, coefficient: f64 },
    /// Volts from first to second node.
    VoltageSource(Box<Source>),
    /// Amperes from first node through the source to the second.
    CurrentSource(Box<Source>),
    /// Anode, cathode. `model` is `None` where it is missing.
    Diode { model: Option<ModelId>, area: f64 },
    /// E: pins + − control+ control−; volts per volt.
    VoltageByVoltage { gain: Value },
    /// G: pins + − control+ control−; amperes per volt, current from first through the source to second.
    CurrentByVoltage { gain: Value },
    /// H: pins + −; volts per ampere of the current through `control` (a voltage source).
    VoltageByCurrent { gain: Value, control: Option<ElementId> },
    /// F: pins + −; amperes per ampere of the current through `control`.
    CurrentByCurrent { gain: Value, control: Option<ElementId> },
    /// S: pins + − control+ control−.
    VoltageSwitch { model: Option<ModelId> },
    /// W: pins + −.
    CurrentSwitch { model: Option<ModelId>, control: Option<ElementId> },
    /// Q (collector base emitter, and a substrate or not), M (drain gate source bulk), J (drain gate source).
    Transistor { model: Option<ModelId> },
    /// Behaviour not known here, with the reason in a few words: `a value that could not be read`.
    Unknown { reason: &'static str },
}

/// Kinds of model.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum ModelKind {
    /// `D`.
    Diode,
    /// `NPN`.
    Npn,
    /// `PNP`.
    Pnp,
    /// `NMOS`.
    Nmos,
    /// `PMOS`.
    Pmos,
    /// `NJF`.
    Njf,
    /// `PJF`.
    Pjf,
    /// `SW`.
    VoltageSwitch,
    /// `CSW`.
    CurrentSwitch,
    /// `R`.
    Resistor,
    /// `C`.
    Capacitor,
    /// `L`.
    Inductor,
    /// Any other word.
    Other,
}

/// One `.model` definition.
#[derive(Debug, Clone, PartialEq)]
pub struct Model {
    /// Name as written.
    pub name: Symbol,
    /// What it describes.
    pub kind: ModelKind,
    /// Parameters in the order written, names in lower case.
    pub parameters: Vec<(String, Value)>,
    /// The whole statement.
    pub statement: Span,
    /// The name in it.
    pub name_span: Span,
}

impl Model {
    /// The parameter of that (lower-case) name; where it is given twice, the last.
    pub fn parameter(&self, name: &str) -> Option<Value> {
        self.parameters.iter().rev().find(|(n, _)| n == name).map(|(_, v)| *v)
    }
}
