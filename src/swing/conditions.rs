//! The range of each diode's forward current over the conditions.

use super::result::OverConditions;
use crate::circuit::{ElementId, State};
use crate::operating::{Case, Operating, Quantity};
use rustc_hash::FxHashMap;

/// Least and greatest forward current of each diode over the conditions in which it conducts. An open current
/// counts with its finite ends; an extreme instant does not count for a diode that it cannot judge.
pub(super) fn over_conditions(operating: &Operating) -> FxHashMap<ElementId, OverConditions> {
    let mut ranges: FxHashMap<ElementId, OverConditions> = FxHashMap::default();
    for case in &operating.cases {
        for diode in case.solutions.iter().flat_map(|s| &s.diodes) {
            let is_left = case.instant && operating.left_to_time.binary_search(&diode.element).is_ok();
            if diode.state != State::Conducting || is_left {
                continue;
            }
            let (low, high) = match diode.current {
                Quantity::Known(current) => (current, current),
                Quantity::Open(interval) => (interval.low.max(0.0), interval.high),
                Quantity::Unknown => continue,
            };
            for current in [low, high].into_iter().filter(|i| i.is_finite()) {
                widen(ranges.entry(diode.element), case, current);
            }
        }
    }
    ranges
}

fn widen(entry: std::collections::hash_map::Entry<'_, ElementId, OverConditions>, case: &Case, current: f64) {
    let range = entry.or_insert_with(|| OverConditions {
        min: current,
        max: current,
        min_case: case.name.clone(),
        max_case: case.name.clone(),
    });
    if current < range.min {
        (range.min, range.min_case) = (current, case.name.clone());
    }
    if current > range.max {
        (range.max, range.max_case) = (current, case.name.clone());
    }
}
