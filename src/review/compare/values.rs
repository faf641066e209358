//! Currents and voltages that move by more than a set share.

use super::cases::Twin;
use super::matching::Pairs;
use super::outcome::Move;
use crate::circuit::{Circuit, ElementId, NodeId};
use crate::operating::{Operating, Quantity, Solution};
use std::collections::{BTreeMap, BTreeSet};

/// What is below this share of the largest of its kind is rounding.
const ROUNDING: f64 = 1e-9;

/// Currents that move, but for those of diodes that flip.
pub(super) fn currents(
    new: (&Circuit, &Operating),
    old: (&Circuit, &Operating),
    twin: Twin<'_>,
    pairs: &Pairs,
    share: f64,
    flipped: &BTreeSet<ElementId>,
) -> Vec<Move> {
    let ([before], [after]) = (twin.old.solutions.as_slice(), twin.new.solutions.as_slice()) else {
        return Vec::new();
    };
    let (was, is) = (all_currents(before), all_currents(after));
    let floor = ROUNDING * largest(was.values()).max(largest(is.values()));
    let is_left = |(circuit, operating): (&Circuit, &Operating), id: ElementId| {
        let mut nodes = circuit.pins(id).iter().map(|p| p.node);
        // a source may feed parts with a memory from a node that it holds itself
        let feeds = b"VEH".contains(&circuit.element(id).letter) && !operating.nodes_left_to_time.is_empty();
        feeds || nodes.any(|node| operating.nodes_left_to_time.binary_search(&node).is_ok())
    };
    let judged = pairs.elements.iter().filter(|p| {
        let left = is_left(old, p.old) || is_left(new, p.new);
        !(flipped.contains(&p.new) || twin.new.instant && left)
    });
    let moves = judged.filter_map(|pair| {
        let sign = if pair.swapped { -1.0 } else { 1.0 };
        let (a, b) = (*was.get(&pair.old)?, sign * *is.get(&pair.new)?);
        moved(a, b, share, floor).then(|| Move {
            name: new.0.element_name(pair.new),
            case: twin.new.name.clone(),
            old: a + 0.0,
            new: b + 0.0,
        })
    });
    moves.collect()
}

/// Voltages that move.
pub(super) fn voltages(
    new: (&Circuit, &Operating),
    old: &Operating,
    twin: Twin<'_>,
    pairs: &Pairs,
    share: f64,
) -> Vec<Move> {
    let ([before], [after]) = (twin.old.solutions.as_slice(), twin.new.solutions.as_slice()) else {
        return Vec::new();
    };
    let (was, is) = (all_voltages(before), all_voltages(after));
    let floor = ROUNDING * largest(was.values()).max(largest(is.values()));
    let is_left = |operating: &Operating, id: &NodeId| operating.nodes_left_to_time.binary_search(id).is_ok();
    let mut moves: Vec<(NodeId, Move)> = pairs
        .nodes
        .iter()
        .filter(|(a, b)| !(twin.new.instant && (is_left(old, a) || is_left(new.1, b))))
        .filter_map(|(node, counterpart)| {
            let (a, b) = (*was.get(&node)?, *is.get(&counterpart)?);
            let name = new.0.node_name(counterpart);
            let case = twin.new.name.clone();
            moved(a, b, share, floor)
                .then_some((counterpart, Move { name, case, old: a + 0.0, new: b + 0.0 }))
        })
        .collect();
    moves.sort_by_key(|m| m.0);
    moves.into_iter().map(|m| m.1).collect()
}

/// Whether a quantity moves by more than `share` of what it was; what is below `floor` is rounding.
pub(super) fn moved(old: f64, new: f64, share: f64, floor: f64) -> bool {
    let (larger, step) = (old.abs().max(new.abs()), (old - new).abs());
    // of a current that was nothing any share is more
    larger > floor && step > share * old.abs() && step > floor
}

fn all_currents(solution: &Solution) -> BTreeMap<ElementId, f64> {
    let diodes = solution.diodes.iter().map(|d| (d.element, d.current));
    let others = solution.branches.iter().map(|b| (b.element, b.current));
    diodes.chain(others).filter_map(|(id, q)| Some((id, Quantity::known(q)?))).collect()
}

fn all_voltages(solution: &Solution) -> BTreeMap<NodeId, f64> {
    solution.nodes.iter().filter_map(|n| Some((n.node, n.voltage.known()?))).collect()
}

fn largest<'v>(values: impl Iterator<Item = &'v f64>) -> f64 {
    values.fold(0.0, |most, value| most.max(value.abs()))
}
