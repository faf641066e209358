//! Which constant drop each diode has, and why: `--drop`, a `drop` note, the model's IS and N, the material,
//! silicon, in that order.

use super::law::{JunctionLaw, nearest_decade};
use super::material::{DRIFT, Material, REFERENCE_TEMPERATURE};
use super::named::Named;
use super::result::{Drop, DropOrigin};
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, Circuit, ElementId, Model, ModelId, ModelKind, Note, NoteKind};
use crate::complementarity::Level;
use crate::config::Options;
use crate::finding::{Finding, Severity, quantity};

/// How a diode's drop comes about.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum DropLaw {
    /// Given by a person; does not move with temperature.
    Fixed(f64, DropOrigin),
    /// From the table; moves −2 mV/K from 27 °C.
    Drifting(f64, DropOrigin),
    /// From the model at a decade of current, as a power of ten.
    Model { law: JunctionLaw, model: ModelId, decade: i32 },
}

/// One diode as numbers, alike in all conditions.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Diode {
    /// The element.
    pub element: ElementId,
    /// Its drop.
    pub law: DropLaw,
    /// Its breakdown voltage, a magnitude.
    pub reverse: Option<Level>,
    /// Its series resistance, ohms.
    pub series: f64,
    /// The exponential law of its model, whatever its drop comes from.
    pub own: Option<JunctionLaw>,
    /// What it is made of.
    pub material: &'static Material,
    /// Current at the breakdown voltage, amperes (IBV), and emission coefficient there (NBV).
    pub tail: (f64, f64),
}

impl Diode {
    /// The drop at `celsius`.
    pub fn drop(&self, circuit: &Circuit, celsius: f64) -> Drop {
        match &self.law {
            DropLaw::Fixed(volts, origin) => Drop { volts: *volts, written: true, origin: origin.clone() },
            DropLaw::Drifting(volts, origin) => {
                let shift = DRIFT * (celsius - REFERENCE_TEMPERATURE);
                Drop { volts: (volts + shift).max(0.0), written: shift == 0.0, origin: origin.clone() }
            }
            DropLaw::Model { law, model, decade } => {
                let current = 10f64.powi(*decade);
                let model = circuit.text(circuit.model(*model).name).to_owned();
                let origin = DropOrigin::Model { model, decade: current };
                Drop { volts: law.voltage(current, celsius), written: false, origin }
            }
        }
    }

    /// The drop as a number for the network.
    pub fn level(&self, celsius: f64) -> Level {
        match &self.law {
            DropLaw::Fixed(volts, _) => Level { value: *volts, exact: true },
            DropLaw::Drifting(volts, _) => {
                let shift = DRIFT * (celsius - REFERENCE_TEMPERATURE);
                Level { value: (volts + shift).max(0.0), exact: shift == 0.0 }
            }
            DropLaw::Model { law, decade, .. } => {
                Level { value: law.voltage(10f64.powi(*decade), celsius), exact: false }
            }
        }
    }

    /// Takes the decade of the same diode in nominal.
    pub fn hold_decade(&mut self, nominal: &Diode) {
        if let (DropLaw::Model { decade, .. }, DropLaw::Model { decade: held, .. }) =
            (&mut self.law, &nominal.law)
        {
            *decade = *held;
        }
    }

    /// Takes a decade that somebody else has chosen; says whether that moved the drop.
    pub fn take_decade(&mut self, chosen: i32) -> bool {
        let DropLaw::Model { decade, .. } = &mut self.law else { return false };
        std::mem::replace(decade, chosen) != chosen
    }

    /// Takes the decade nearest to the greatest forward current found; says whether that moved the drop.
    pub fn choose_decade(&mut self, greatest: Option<f64>) -> bool {
        let DropLaw::Model { decade, .. } = &mut self.law else { return false };
        let nearest = nearest_decade(greatest);
        std::mem::replace(decade, nearest) != nearest
    }
}

/// All diodes in the order of the text, with what notes and options say about them.
pub(crate) fn diodes(
    circuit: &Circuit,
    directory: Option<&Directory<'_>>,
    options: &Options,
    findings: &mut Vec<Finding>,
) -> Vec<Diode> {
    let drops = Named::collect(circuit, directory, "drop", drop_volts, findings);
    let materials = Named::collect(circuit, directory, "made-of", material, findings);
    let everywhere = options.drop.filter(|v| *v >= 0.0 && v.is_finite());
    let law = |id, model: Option<ModelId>, area: f64| {
        let from_model = || {
            let model = model?;
            let law = JunctionLaw::of(circuit.model(model), area, circuit.nominal_temperature)?;
            Some(DropLaw::Model { law, model, decade: -3 })
        };
        let from_material =
            || materials.of(circuit, id).map(|m| DropLaw::Drifting(m.drop, DropOrigin::Material(m.word)));
        everywhere
            .map(|volts| DropLaw::Fixed(volts, DropOrigin::Option))
            .or_else(|| drops.of(circuit, id).map(|&volts| DropLaw::Fixed(volts, DropOrigin::Note)))
            .or_else(from_model)
            .or_else(from_material)
            .unwrap_or(DropLaw::Drifting(Material::SILICON.drop, DropOrigin::Default))
    };
    let diode = |(id, element): (ElementId, &crate::circuit::Element)| {
        let Behaviour::Diode { model, area } = element.behaviour else { return None };
        let area = if area > 0.0 { area } else { 1.0 };
        let model = model.filter(|&m| circuit.model(m).kind == ModelKind::Diode);
        let parameters = model.map(|m| circuit.model(m));
        Some(Diode {
            element: id,
            own: model.and_then(|m| JunctionLaw::of(circuit.model(m), area, circuit.nominal_temperature)),
            material: materials.of(circuit, id).copied().unwrap_or(&Material::SILICON),
            tail: parameters.map_or((1e-3, 1.0), |m| tail(m, area)),
            law: law(id, model, area),
            reverse: parameters.and_then(breakdown),
            series: parameters.map_or(0.0, |m| series(m, area)),
        })
    };
    circuit.elements().filter_map(diode).collect()
}

/// BV; a model that writes it with a minus means the same.
fn breakdown(model: &Model) -> Option<Level> {
    let bv = model.parameter("bv")?;
    let value = bv.number.abs();
    (value > 0.0 && value.is_finite()).then_some(Level { value, exact: bv.written })
}

/// IBV times the area, and NBV; 1 mA and 1 where not given.
fn tail(model: &Model, area: f64) -> (f64, f64) {
    let positive = |name| model.parameter(name).map(|v| v.number.abs()).filter(|v| *v > 0.0 && v.is_finite());
    (positive("ibv").unwrap_or(1e-3) * area, positive("nbv").unwrap_or(1.0))
}

/// RS, divided by the area.
fn series(model: &Model, area: f64) -> f64 {
    model.parameter("rs").map_or(0.0, |v| v.number / area).clamp(0.0, f64::MAX)
}

fn drop_volts(note: &Note) -> Option<Result<f64, Finding>> {
    let NoteKind::Drop(value) = &note.kind else { return None };
    let volts = value.number;
    if volts >= 0.0 && volts.is_finite() {
        return Some(Ok(volts));
    }
    let message = format!("a drop of {} is no forward drop", quantity(volts, "V"));
    Some(Err(Finding::new("unusable-note", Severity::Error, value.span, message)
        .label("less than 0 V")
        .help("A conducting diode takes a voltage from anode to cathode; write it as 0 or more. The note is not used.")))
}

fn material(note: &Note) -> Option<Result<&'static Material, Finding>> {
    let NoteKind::MadeOf(word) = &note.kind else { return None };
    let known = super::material::MATERIALS.map(|m| m.word).join(", ");
    Some(Material::named(word).ok_or_else(|| {
        let message = format!("`{word}` is no material that the table holds");
        Finding::new("unusable-note", Severity::Error, note.span, message).help(format!(
            "Known are {known}. The note is not used; a `drop` note can give the volts instead."
        ))
    }))
}
