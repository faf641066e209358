//! What the mark behind a diode says: its state with current and voltage, where a condition changes it, and for a
//! diode with many instances how many are in which state.

use super::figures::{amperes, span, volts};
use crate::analysis::Analysis;
use crate::circuit::{Behaviour, ElementId, State};
use crate::operating::{Case, DiodeResult, Interval, Operating, Quantity, Solution};
use crate::swing::Swing;
use crate::text::Span;
use std::collections::BTreeMap;

/// What stands in the place of a condition for the whole period.
const OVER_TIME: &str = "over time";
/// Conditions listed by name.
const MOST_CONDITIONS: usize = 3;
/// A number below this share of the largest of its kind is rounding, not an answer.
const ROUNDING: f64 = 1e-12;

/// What one diode goes through: its states in the order in which the conditions show them.
pub(super) type Life = Vec<Stay>;

/// The mark of every diode statement, without its `;@`, by the statement's place; those of included files too.
pub fn marks(analysis: &Analysis) -> BTreeMap<Span, String> {
    lives(analysis).into_iter().map(|(statement, lives)| (statement, words(&lives))).collect()
}

/// What a mark says of all diodes of one statement.
pub(super) fn words(lives: &[Life]) -> String {
    match lives {
        [only] => one(only),
        many => summary(many),
    }
}

/// The lives of every diode statement, one for each instance, by the statement's place.
pub(super) fn lives(analysis: &Analysis) -> BTreeMap<Span, Vec<Life>> {
    let mut instances: BTreeMap<Span, Vec<ElementId>> = BTreeMap::new();
    for (id, element) in analysis.circuit.elements() {
        if matches!(element.behaviour, Behaviour::Diode { .. }) {
            instances.entry(element.statement).or_default().push(id);
        }
    }
    let Some(operating) = &analysis.operating else { return BTreeMap::new() };
    let scales: Vec<Vec<(f64, f64)>> =
        operating.cases.iter().map(|case| case.solutions.iter().map(scale).collect()).collect();
    let life = |&id: &ElementId| {
        let mut stays = stays(operating, &scales, id);
        if let Some(swing) = &analysis.swing
            && operating.left_to_time.binary_search(&id).is_ok()
        {
            over_time(swing, id, &mut stays);
        }
        stays
    };
    instances.into_iter().map(|(statement, ids)| (statement, ids.iter().map(life).collect())).collect()
}

/// One state and the conditions in which it holds.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Stay {
    state: State,
    conditions: Vec<String>,
    current: Option<(f64, f64)>,
    voltage: Option<(f64, f64)>,
}

/// The states of a diode in the order in which the conditions show them.
fn stays(operating: &Operating, scales: &[Vec<(f64, f64)>], id: ElementId) -> Vec<Stay> {
    let mut stays: Vec<Stay> = Vec::new();
    for (case, scales) in operating.cases.iter().zip(scales) {
        if case.instant && operating.left_to_time.binary_search(&id).is_ok() {
            continue;
        }
        if case.solutions.is_empty() {
            add(&mut stays, State::NotEvaluated, case.name.clone(), None, None);
        }
        for (n, (solution, scale)) in case.solutions.iter().zip(scales).enumerate() {
            let at = solution.diodes.binary_search_by_key(&id, |d| d.element);
            let Ok(diode) = at.map(|at| &solution.diodes[at]) else { continue };
            let name = set_name(case, n);
            add(&mut stays, diode.state, name, current(diode, scale.1), ends(diode.voltage, scale.0));
        }
    }
    stays
}

/// What one instant cannot judge: the states that are reached in the period, without numbers, since those of a time pass
/// are not certain to the last digit.
fn over_time(swing: &Swing, id: ElementId, stays: &mut Vec<Stay>) {
    let Some(time) = swing.diode(id).and_then(|d| d.over_time.as_ref()) else { return };
    for state in time.states(swing.window) {
        add(stays, state, OVER_TIME.to_owned(), None, None);
    }
}

/// `VIN=9`; of several consistent sets `VIN=9#2`.
fn set_name(case: &Case, number: usize) -> String {
    if case.solutions.len() > 1 { format!("{}#{}", case.name, number + 1) } else { case.name.clone() }
}

fn add(
    stays: &mut Vec<Stay>,
    state: State,
    condition: String,
    current: Option<(f64, f64)>,
    voltage: Option<(f64, f64)>,
) {
    let wider = |a: Option<(f64, f64)>, b: Option<(f64, f64)>| match (a, b) {
        (Some(a), Some(b)) => Some((a.0.min(b.0), a.1.max(b.1))),
        (a, b) => a.or(b),
    };
    match stays.iter_mut().find(|s| s.state == state) {
        Some(stay) => {
            stay.conditions.push(condition);
            stay.current = wider(stay.current, current);
            stay.voltage = wider(stay.voltage, voltage);
        }
        None => stays.push(Stay { state, conditions: vec![condition], current, voltage }),
    }
}

/// The largest voltage and the largest current of a solution.
fn scale(solution: &Solution) -> (f64, f64) {
    let largest = |values: &mut dyn Iterator<Item = Quantity>| {
        values.filter_map(Quantity::known).map(f64::abs).fold(0.0, f64::max)
    };
    let voltages = solution.nodes.iter().map(|n| n.voltage).chain(solution.diodes.iter().map(|d| d.voltage));
    let currents =
        solution.branches.iter().map(|b| b.current).chain(solution.diodes.iter().map(|d| d.current));
    (largest(&mut { voltages }), largest(&mut { currents }))
}

/// The current's magnitude in the direction that the state implies.
fn current(diode: &DiodeResult, scale: f64) -> Option<(f64, f64)> {
    let (low, high) = ends(diode.current, scale)?;
    Some(if diode.state == State::Breakdown { (-high, -low) } else { (low, high) })
}

fn ends(quantity: Quantity, scale: f64) -> Option<(f64, f64)> {
    let clean = |value: f64| if value.abs() <= ROUNDING * scale { 0.0 } else { value };
    match quantity {
        Quantity::Known(value) => Some((clean(value), clean(value))),
        Quantity::Open(Interval { low, high }) => Some((clean(low), clean(high))),
        Quantity::Unknown => None,
    }
}

/// `conducting 4.31mA 0.652V`, `blocking -12.4V`, `conducting 4.30mA..9.10mA | blocking at VIN=9`
fn one(stays: &[Stay]) -> String {
    match stays {
        [] => State::NotEvaluated.word().to_owned(),
        [only] => only.words(true),
        [first, others @ ..] => {
            let mut parts = vec![first.words(false)];
            parts.extend(others.iter().map(|s| format!("{} {}", s.words(false), place(&s.conditions))));
            parts.join(" | ")
        }
    }
}

/// `at VIN=9`, `over time`, `at VIN=9 and over time`
fn place(conditions: &[String]) -> String {
    let (period, named): (Vec<String>, Vec<String>) =
        conditions.iter().cloned().partition(|c| c == OVER_TIME);
    match (named.is_empty(), period.is_empty()) {
        (false, true) => format!("at {}", self::conditions(&named)),
        (false, false) => format!("at {} and {OVER_TIME}", self::conditions(&named)),
        _ => OVER_TIME.to_owned(),
    }
}

/// `VIN=9`, `VIN=9 VIN=9,temp=-40`, `VIN=9 VIN=16 and 6 more`
fn conditions(names: &[String]) -> String {
    if names.len() <= MOST_CONDITIONS {
        return names.join(" ");
    }
    let shown = MOST_CONDITIONS - 1;
    format!("{} and {} more", names[..shown].join(" "), names.len() - shown)
}

impl Stay {
    fn words(&self, with_voltage: bool) -> String {
        let mut words = self.state.word().to_owned();
        if matches!(self.state, State::Conducting | State::Breakdown)
            && let Some(current) = self.current
        {
            words = format!("{words} {}", span(current, amperes));
        }
        if with_voltage
            && !matches!(self.state, State::Open | State::NotEvaluated)
            && let Some(voltage) = self.voltage
        {
            words = format!("{words} {}", span(voltage, volts));
        }
        words
    }
}

/// `in 12 instances: conducting 4.31mA..9.10mA 0.652V..0.660V`, `in 12 instances: 8 conducting 4.31mA | 4 blocking`
fn summary(lives: &[Life]) -> String {
    let mut kinds: Vec<(String, usize, Vec<Stay>)> = Vec::new();
    for life in lives {
        let states: Vec<&str> = life.iter().map(|s| s.state.word()).collect();
        let kind = states.join(" or ");
        let at = kinds.iter().position(|k| k.0 == kind).unwrap_or_else(|| {
            kinds.push((kind, 0, Vec::new()));
            kinds.len() - 1
        });
        kinds[at].1 += 1;
        if let [only] = life.as_slice() {
            add(&mut kinds[at].2, only.state, String::new(), only.current, only.voltage);
        }
    }
    let head = format!("in {} instances:", lives.len());
    let words = |(kind, _, stays): &(String, usize, Vec<Stay>), with_voltage| match stays.as_slice() {
        [only] => only.words(with_voltage),
        _ => kind.clone(),
    };
    match kinds.as_slice() {
        [only] => format!("{head} {}", words(only, true)),
        several => {
            let parts: Vec<String> = several.iter().map(|k| format!("{} {}", k.1, words(k, false))).collect();
            format!("{head} {}", parts.join(" | "))
        }
    }
}
