//! A diode's knee: the exponential law beside its constant drop, how far the drop may be off at a current, and what
//! a blocking diode leaks. Law by law; networks are solved elsewhere.

use super::assemble::Setting;
use super::drop::{Diode, DropLaw};
use super::law::thermal_voltage;
use super::result::Knee;
use crate::circuit::State;
use crate::complementarity::{Curve, Tail, View};

/// A drop below this makes an ideal diode: nobody means a junction by it, unless a model says so.
const IDEAL: f64 = 0.1;
/// A model with an emission coefficient below this is meant as an ideal diode.
const STEEP: f64 = 0.5;
/// How far a drop that no model gives may be off, volts.
pub(crate) const UNKNOWN: f64 = 0.1;
/// What two diodes of one model differ by at one current, as a share of N·kT/q.
pub(crate) const SCATTER: f64 = 0.25;

/// The smooth law of a diode with a drop of `drop` volts at `celsius`: its model's, else the one that passes
/// through the drop at the reference current of its material. `None` for an ideal diode.
pub(crate) fn curve(diode: &Diode, drop: f64, celsius: f64) -> Option<Curve> {
    // a hot Schottky diode has a small drop, but it is a junction
    let is_junction = matches!(&diode.law, DropLaw::Model { law, .. } if law.emission >= STEEP);
    if drop < IDEAL && !is_junction {
        return None;
    }
    let thermal = thermal_voltage(celsius);
    let (ln_saturation, slope) = match &diode.own {
        Some(law) => (law.ln_saturation(celsius), law.emission * thermal),
        None => {
            let slope = diode.material.emission * thermal;
            // ln(exp(x) - 1) without overflow
            let x = drop / slope;
            (diode.material.reference.ln() - (x + (-(-x).exp()).ln_1p()), slope)
        }
    };
    let tail = diode.reverse.map(|reverse| Tail {
        level: reverse.value,
        ln_current: diode.tail.0.ln(),
        slope: diode.tail.1 * thermal,
    });
    Some(Curve { ln_saturation, slope, tail, series: diode.series })
}

/// The knee of a diode in a state at a current (amperes, anode to cathode, where known).
pub(crate) fn knee(diode: &Diode, curve: &Curve, drop: f64, state: State, current: Option<f64>) -> Knee {
    let is_known = diode.own.is_some();
    let reference = Curve { series: 0.0, tail: None, ..*curve }.current(drop);
    let uncertainty = match (state, current) {
        (State::Breakdown, Some(i)) => {
            let slope = curve.tail.map_or(0.0, |t| t.slope);
            slope * ((i.abs() / diode.tail.0).ln().abs() + SCATTER)
        }
        (State::Conducting, Some(i)) if i > 0.0 => {
            let there = Curve { series: 0.0, ..*curve }.voltage(i);
            let off = (there - drop).abs() + SCATTER * curve.slope;
            if is_known { off } else { off.max(UNKNOWN) }
        }
        _ if is_known => SCATTER * curve.slope,
        _ => UNKNOWN,
    };
    Knee { slope: curve.slope, reference, is_known, uncertainty }
}

/// What a blocking diode leaks, a magnitude in amperes: its law at the voltage that it sees, behind the resistance
/// that it sees, where `more` volts are added in its forward and in its reverse direction.
pub(crate) fn leakage(curve: &Curve, view: Option<View>, voltage: f64, more: f64) -> f64 {
    let (seen, ohms) = match view {
        Some(view) if view.resistance.is_finite() => (view.open_circuit, view.resistance.max(curve.series)),
        _ => (voltage, curve.series),
    };
    let behind = Curve { series: ohms, ..*curve };
    behind.current(seen + more).abs().max(behind.current(seen - more).abs())
}

/// The law of a diode at the temperature of the setting.
pub(crate) fn curve_of(setting: &Setting<'_>, diode: &Diode) -> Option<Curve> {
    let celsius = setting.condition.temperature;
    curve(diode, diode.level(celsius).value, celsius)
}
