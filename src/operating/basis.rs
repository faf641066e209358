//! What the time pass takes over from the operating point: the plan of sources, the diodes with their drops, and how
//! transistors and switches stand, so that both see one model. Nothing is solved here.

use super::condition::{Condition, Plan};
use super::drop::Diode;
use super::switch::{CLOSED, OPEN};
use crate::circuit::{Behaviour, Circuit, ElementId, Source};

/// The model that both passes share.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Basis {
    /// Sources, supplies and conditions.
    pub plan: Plan,
    /// The diodes in the order of the text, their decades chosen.
    pub diodes: Vec<Diode>,
}

/// A diode's numbers in nominal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Numbers {
    /// Drop, volts.
    pub forward: f64,
    /// Breakdown voltage, a magnitude.
    pub reverse: Option<f64>,
    /// Ohms in series.
    pub series: f64,
}

/// How the main path of a transistor or switch stands over time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Standing {
    /// Carries nothing.
    Open,
    /// A resistance in ohms, or none.
    Through(f64),
    /// As its control voltage says: closed above one level, open below another, with these resistances.
    Follows { closes: f64, opens: f64, on: f64, off: f64 },
    /// Not known.
    Unknown,
}

impl Basis {
    /// The nominal condition.
    pub fn nominal(&self) -> Option<&Condition> {
        self.plan.conditions.first()
    }

    /// The independent source of an element.
    pub fn source<'a>(&self, circuit: &'a Circuit, id: ElementId) -> Option<&'a Source> {
        super::condition::source(circuit, id)
    }

    /// The numbers of a diode.
    pub fn junction(&self, id: ElementId) -> Option<Numbers> {
        let at = self.diodes.binary_search_by_key(&id, |d| d.element).ok()?;
        let diode = &self.diodes[at];
        let celsius = self.nominal()?.temperature;
        let numbers = Numbers {
            forward: diode.level(celsius).value,
            reverse: diode.reverse.map(|level| level.value),
            series: diode.series,
        };
        numbers.forward.is_finite().then_some(numbers)
    }

    /// How an element's main path stands.
    pub fn standing(&self, circuit: &Circuit, id: ElementId) -> Standing {
        let held = self.nominal().and_then(|nominal| {
            nominal.held.binary_search_by_key(&id, |h| h.0).ok().map(|at| nominal.held[at].1)
        });
        let model = match circuit.element(id).behaviour {
            Behaviour::VoltageSwitch { model } | Behaviour::CurrentSwitch { model, .. } => model,
            _ => None,
        };
        let number = |name: &str| model.and_then(|m| circuit.model(m).parameter(name)).map(|v| v.number);
        match (held, &circuit.element(id).behaviour) {
            (Some(false), _) => Standing::Open,
            (Some(true), _) => Standing::Through(number("ron").unwrap_or(0.0)),
            (None, Behaviour::VoltageSwitch { model: Some(_) }) => {
                let (threshold, half) = (number("vt").unwrap_or(0.0), number("vh").unwrap_or(0.0).abs());
                Standing::Follows {
                    closes: threshold + half,
                    opens: threshold - half,
                    on: number("ron").unwrap_or(CLOSED),
                    off: number("roff").unwrap_or(OPEN),
                }
            }
            _ => Standing::Unknown,
        }
    }
}
