//! What one instant cannot judge, compared over the period: states that are reached, mean currents and voltages. Only for
//! parts that a moving source reaches through something with a memory.

use super::matching::Pairs;
use super::outcome::{Comparison, Move, StateChange};
use super::values::moved;
use crate::analysis::Analysis;
use crate::circuit::{ElementId, NodeId, State};
use crate::operating::Operating;
use crate::swing::{OverTime, Swing};
use std::collections::BTreeSet;

/// Stands in the place of a condition.
const CASE: &str = "over time";
/// What is below this share of the largest of its kind is not certain over time.
const ROUNDING: f64 = 1e-6;

/// Adds what differs over the period.
pub(super) fn add(old: &Analysis, new: &Analysis, pairs: &Pairs, share: f64, comparison: &mut Comparison) {
    let (Some(before), Some(after)) = (&old.swing, &new.swing) else { return };
    let (Some(was), Some(is)) = (&old.operating, &new.operating) else { return };
    let flipped = states(new, (before, was), (after, is), pairs, comparison);
    currents(new, (before, was), (after, is), pairs, share, &flipped, comparison);
    voltages(new, (before, was), (after, is), pairs, share, comparison);
}

type Side<'a> = (&'a Swing, &'a Operating);

/// A diode over the period, where one instant cannot judge it.
fn figures<'a>((swing, operating): Side<'a>, id: ElementId) -> Option<&'a OverTime> {
    operating.left_to_time.binary_search(&id).ok()?;
    swing.diode(id)?.over_time.as_ref()
}

/// The state that tells most: one that is reached beside blocking.
fn telling(time: &OverTime, window: f64) -> State {
    let states = time.states(window);
    states.iter().copied().find(|s| *s != State::Blocking).unwrap_or(State::Blocking)
}

fn states(
    new: &Analysis,
    before: Side<'_>,
    after: Side<'_>,
    pairs: &Pairs,
    comparison: &mut Comparison,
) -> BTreeSet<ElementId> {
    let mut flipped = BTreeSet::new();
    for pair in &pairs.elements {
        let (Some(was), Some(is)) = (figures(before, pair.old), figures(after, pair.new)) else { continue };
        let (old_state, new_state) = (telling(was, before.0.window), telling(is, after.0.window));
        if old_state == new_state {
            continue;
        }
        flipped.insert(pair.new);
        let often = |time: &OverTime| match 100.0 * time.conducting_share {
            share if share < 5e-4 => "never".to_owned(),
            share => format!("{share:.3} % of the time"),
        };
        comparison.states.push(StateChange {
            diode: new.circuit.element_name(pair.new),
            case: CASE.to_owned(),
            old: Some(old_state),
            new: Some(new_state),
            old_current: Some(was.current_peak),
            new_current: Some(is.current_peak),
            why: format!("It conducts {}, where it was {}.", often(is), often(was)),
        });
    }
    flipped
}

fn currents(
    new: &Analysis,
    before: Side<'_>,
    after: Side<'_>,
    pairs: &Pairs,
    share: f64,
    flipped: &BTreeSet<ElementId>,
    comparison: &mut Comparison,
) {
    let largest = |(swing, _): Side<'_>| {
        let all = swing.diodes.iter().filter_map(|d| d.over_time.as_ref());
        all.map(|time| time.current_mean.abs()).fold(0.0, f64::max)
    };
    let floor = ROUNDING * largest(before).max(largest(after));
    for pair in pairs.elements.iter().filter(|p| !flipped.contains(&p.new)) {
        let (Some(was), Some(is)) = (figures(before, pair.old), figures(after, pair.new)) else { continue };
        if moved(was.current_mean, is.current_mean, share, floor) {
            comparison.currents.push(Move {
                name: new.circuit.element_name(pair.new),
                case: CASE.to_owned(),
                old: was.current_mean,
                new: is.current_mean,
            });
        }
    }
}

fn voltages(
    new: &Analysis,
    before: Side<'_>,
    after: Side<'_>,
    pairs: &Pairs,
    share: f64,
    comparison: &mut Comparison,
) {
    let mean = |(swing, operating): Side<'_>, node: NodeId| {
        operating.nodes_left_to_time.binary_search(&node).ok()?;
        Some(swing.node(node)?.over_time?.mean)
    };
    let largest = |(swing, _): Side<'_>| {
        let all = swing.nodes.iter().filter_map(|n| n.over_time);
        all.map(|level| level.max.abs().max(level.min.abs())).fold(0.0, f64::max)
    };
    let floor = ROUNDING * largest(before).max(largest(after));
    let mut moves: Vec<(NodeId, Move)> = pairs
        .nodes
        .iter()
        .filter_map(|(node, counterpart)| {
            let (was, is) = (mean(before, node)?, mean(after, counterpart)?);
            let name = new.circuit.node_name(counterpart);
            let change = Move { name, case: CASE.to_owned(), old: was, new: is };
            moved(was, is, share, floor).then_some((counterpart, change))
        })
        .collect();
    moves.sort_by_key(|m| m.0);
    comparison.voltages.extend(moves.into_iter().map(|m| m.1));
}
