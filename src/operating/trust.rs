//! How far each constant-drop answer may be believed: error bars from the uncertainty of all drops and the leakage
//! of all blocking diodes, and what that means in words. Nothing here comes from the second opinion.

use super::assemble::{Assembly, Owner, Setting};
use super::case::state;
use super::drop::Diode;
use super::knee::{SCATTER, UNKNOWN, curve, knee, leakage};
use super::result::{DiodeResult, ErrorBar, Knee, Trust};
use crate::circuit::{ElementId, State};
use crate::complementarity::{Curve, Place, Quantity, Solution, Spread, View};
use crate::finding::quantity;

/// An error bar up to this share of the current is good.
pub(crate) const GOOD: f64 = 0.05;
/// Up to this, fair.
pub(crate) const FAIR: f64 = 0.20;

/// What is known while one solution is judged.
pub(crate) struct Judge<'a> {
    pub setting: &'a Setting<'a>,
    pub assembly: &'a Assembly,
    pub solution: &'a Solution,
}

impl Judge<'_> {
    /// How uncertain a junction is: volts of its level where it carries current, amperes that it leaks where it
    /// blocks and the other drops move what it sees by `more` volts.
    pub fn doubt(&self, branch: u32, view: Option<View>, more: f64) -> f64 {
        let Some((diode, curve, drop)) = self.diode_of(branch) else { return 0.0 };
        let place = self.solution.places[branch as usize];
        let current = self.solution.currents[branch as usize].known();
        match place {
            Place::Blocking => {
                let voltage = self.solution.voltages[branch as usize].known().unwrap_or(0.0);
                leakage(&curve, view, voltage, more)
            }
            _ => knee(diode, &curve, drop, state(place), current).uncertainty,
        }
    }

    fn diode_of(&self, branch: u32) -> Option<(&Diode, Curve, f64)> {
        let Some(Owner::Element(id)) = self.assembly.owner.get(branch as usize) else { return None };
        let diode = self.setting.diode(*id)?;
        let celsius = self.setting.condition.temperature;
        let drop = diode.level(celsius).value;
        Some((diode, curve(diode, drop, celsius)?, drop))
    }

    fn element(&self, branch: u32) -> Option<ElementId> {
        match self.assembly.owner.get(branch as usize) {
            Some(Owner::Element(id)) => Some(*id),
            _ => None,
        }
    }

    /// Fills in knee, error bar, trust and reasons of a diode. `spread` is what the others' uncertainty and its own
    /// do to its current, or to its voltage where it blocks.
    pub fn judge(&self, result: &mut DiodeResult, diode: &Diode, spread: Option<Spread>) {
        let celsius = self.setting.condition.temperature;
        let law = curve(diode, result.drop.volts, celsius);
        result.knee = law.map(|c| knee(diode, &c, result.drop.volts, result.state, result.current.known()));
        match (result.state, result.current, spread) {
            (State::NotEvaluated, ..) => {}
            (State::Blocking, _, spread) => self.blocking(result, diode, law, spread),
            (_, Quantity::Known(current), Some(spread)) if current != 0.0 => {
                self.carrying(result, current, spread);
            }
            (_, Quantity::Open(_), _) => {
                result.trust = Some(Trust::Poor);
                result.trust_reasons = vec![
                    "how the current divides is open: it hangs on differences of drops that this model does not know"
                        .into(),
                ];
            }
            _ => {}
        }
    }

    fn most(&self, spread: &Spread) -> Option<(ElementId, f64)> {
        self.element(spread.most.0).map(|id| (id, spread.most.1))
    }

    fn carrying(&self, result: &mut DiodeResult, current: f64, spread: Spread) {
        let uncertainty = result.knee.map_or(0.0, |k| k.uncertainty);
        result.error = Some(ErrorBar {
            current: spread.total,
            voltage: uncertainty + result.series * spread.total,
            most: self.most(&spread),
        });
        let share = spread.total / current.abs();
        let trust = match share {
            s if s <= GOOD => Trust::Good,
            s if s <= FAIR => Trust::Fair,
            _ => Trust::Poor,
        };
        result.trust = Some(trust);
        if trust != Trust::Good {
            result.trust_reasons = self.reasons(result, current.abs(), &spread);
        }
    }

    /// The largest contribution in words, then all together where that is clearly more.
    fn reasons(&self, result: &DiodeResult, current: f64, spread: &Spread) -> Vec<String> {
        let carries = format!("carries {}", quantity(current, "A"));
        let worst = self.most(spread);
        let told = match (worst, result.knee) {
            (Some((id, _)), Some(knee)) if id == result.element => {
                own_reason(result, &knee, current, spread.own)
            }
            (Some((id, part)), _) => self.other_reason(id, part, current),
            _ => format!("its error bar is {} of this current", percent(spread.total, current)),
        };
        let mut reasons = vec![format!("{carries}; {told}")];
        if spread.total > 1.25 * spread.most.1 {
            let all = percent(spread.total, current);
            reasons.push(format!("all drops and leakages together may be worth {all} of this current"));
        }
        reasons
    }

    fn other_reason(&self, id: ElementId, part: f64, current: f64) -> String {
        let name = self.setting.circuit.element_name(id);
        let branch = self.assembly.branch[id.index()];
        let share = percent(part, current);
        let blocks = self.solution.places.get(branch as usize) == Some(&Place::Blocking);
        let doubt = self.doubt(branch, None, 0.0);
        if blocks {
            format!("what the blocking {name} leaks is worth {share} of it")
        } else {
            format!("the drop of {name}, known to {}, is worth {share} of it", quantity(doubt, "V"))
        }
    }

    fn blocking(&self, result: &mut DiodeResult, diode: &Diode, law: Option<Curve>, spread: Option<Spread>) {
        let others = spread.map_or(0.0, |s| s.others());
        let Some(law) = law else {
            // an ideal diode leaks nothing, but others may still push it over its corner
            if result.margin.is_some() && spread.is_some() {
                let error =
                    ErrorBar { current: 0.0, voltage: others, most: spread.and_then(|s| self.most(&s)) };
                result.error = Some(error);
                result.trust = Some(Trust::Good);
                self.edge(result, others, None);
            }
            return;
        };
        let own = if diode.own.is_some() { SCATTER * law.slope } else { UNKNOWN };
        let voltage = result.voltage.known().unwrap_or(0.0);
        let bound = leakage(&law, result.view, voltage, others + own);
        let most = spread.and_then(|s| self.most(&s));
        result.error = Some(ErrorBar { current: bound, voltage: others, most });
        let shift = result.view.map(|v| bound * (v.resistance - result.series).max(0.0));
        let share = match (result.view, shift) {
            // a node at rest is not wrong because a microvolt moves it: a drop is the least that matters
            (Some(view), Some(shift)) => shift / view.open_circuit.abs().max(result.drop.volts),
            _ => 0.0,
        };
        let trust = match share {
            s if s <= GOOD => Trust::Good,
            s if s <= FAIR => Trust::Fair,
            _ => Trust::Poor,
        };
        result.trust = Some(trust);
        if let (Some(shift), true) = (shift, trust != Trust::Good) {
            result.trust_reasons.push(leak_reason(result, bound, shift));
        }
        self.edge(result, others + own, result.knee.map(|k| k.reference));
    }

    /// A state whose margin is less than what all uncertainty may move is in doubt.
    fn edge(&self, result: &mut DiodeResult, all: f64, reference: Option<f64>) {
        let Some(margin) = result.margin.filter(|m| *m < all) else { return };
        result.trust = Some(Trust::Poor);
        let at = reference.map_or(String::new(), |i| format!(" (at {})", quantity(i, "A")));
        result.trust_reasons.insert(
            0,
            format!(
                "its margin of {} to the drop of {}{at} is less than the {} to which the drops are known: it may conduct",
                quantity(margin, "V"),
                quantity(result.drop.volts, "V"),
                quantity(all, "V")
            ),
        );
    }
}

/// `its 0.70 V drop belongs to 1 mA: 2.5 decades, 150 mV, 34 % of this current`
fn own_reason(result: &DiodeResult, knee: &Knee, current: f64, own: f64) -> String {
    let drop = quantity(result.drop.volts, "V");
    let share = percent(own, current);
    if result.state == State::Breakdown {
        let off = quantity(knee.uncertainty, "V");
        return format!("its breakdown voltage there is known to {off} only, {share} of this current");
    }
    let decades = (current / knee.reference).log10();
    let off = decades.abs() * knee.slope * std::f64::consts::LN_10;
    if off > 0.5 * knee.uncertainty {
        let at = quantity(knee.reference, "A");
        let off = quantity(off, "V");
        format!(
            "its {drop} drop belongs to {at}: {:.1} decades, {off}, {share} of this current",
            decades.abs()
        )
    } else if knee.is_known {
        let off = quantity(knee.uncertainty, "V");
        format!("{off} more or less of its {drop} drop is {share} of this current")
    } else {
        let off = quantity(knee.uncertainty, "V");
        format!("its {drop} drop is assumed, and {off} more or less is {share} of this current")
    }
}

fn leak_reason(result: &DiodeResult, bound: f64, shift: f64) -> String {
    let seen = result.view.map_or(0.0, |v| v.open_circuit);
    let (bound, shift) = (quantity(bound, "A"), quantity(shift, "V"));
    if seen > 0.0 {
        format!(
            "sees {} of the {} at which it is taken to conduct, and may already carry {bound}, which moves that by \
             {shift}",
            quantity(seen, "V"),
            quantity(result.drop.volts, "V")
        )
    } else {
        let ohms = result.view.map_or(0.0, |v| v.resistance);
        format!("may leak {bound}, which is {shift} across the {} that it sees", quantity(ohms, "Ω"))
    }
}

/// `34 %`; beyond all of it, how many times.
pub(crate) fn percent(part: f64, whole: f64) -> String {
    let share = 100.0 * part / whole;
    match share {
        s if s >= 999.5 => format!("{:.0} times", share / 100.0),
        s if s >= 9.95 => format!("{s:.0} %"),
        s => format!("{s:.1} %"),
    }
}
