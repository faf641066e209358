//! Whether one result is what a note expects, and in what words it is not.

use crate::circuit::{Circuit, ElementId, Expectation, NodeId, State};
use crate::finding::{interval, quantity};
use crate::operating::{self, Case, DiodeResult, Interval, Quantity, Solution};

/// Rounding of sums is no miss.
const ROUNDING: f64 = 1e-9;

/// Whether an expectation is met.
pub enum Met {
    /// It is.
    Yes,
    /// It is not: the kind of what was found, the same in words with numbers, and the reasoning in one line.
    No { kind: &'static str, words: String, why: String },
    /// It cannot be said, and why.
    Unknown(String),
}

/// A diode's state and current against what is expected.
pub fn diode_met(
    circuit: &Circuit,
    case: &Case,
    solution: &Solution,
    id: ElementId,
    wanted: &Expectation,
) -> Met {
    let Ok(at) = solution.diodes.binary_search_by_key(&id, |d| d.element) else {
        return Met::Unknown("it is not among the diodes that were solved".into());
    };
    let diode = &solution.diodes[at];
    let expected = wanted.state.unwrap_or(diode.state);
    if diode.state == State::NotEvaluated {
        let why = diode.not_evaluated.clone().unwrap_or_else(|| "its part was not solved".into());
        return Met::Unknown(format!("it is not evaluated: {why}"));
    }
    let within = wanted.range.is_none_or(|range| inside(magnitude(diode), range));
    if diode.state == expected && within {
        return Met::Yes;
    }
    Met::No {
        kind: diode.state.word(),
        words: diode_words(diode, wanted.range),
        why: operating::against(circuit, case, diode, expected),
    }
}

/// A node's voltage against the range that is expected.
pub fn node_met(circuit: &Circuit, solution: &Solution, node: NodeId, wanted: &Expectation) -> Met {
    let voltage = if node == NodeId::GROUND {
        Quantity::Known(0.0)
    } else {
        let at = solution.nodes.binary_search_by_key(&node, |n| n.node);
        at.map_or(Quantity::Unknown, |at| solution.nodes[at].voltage)
    };
    let Some(range) = wanted.range else { return Met::Yes };
    let words = match voltage {
        Quantity::Unknown => return Met::Unknown("its voltage is not evaluated".into()),
        _ if inside(voltage, range) => return Met::Yes,
        Quantity::Known(volts) => apart_from(volts, range, "V"),
        Quantity::Open(Interval { low, high }) => format!("left open ({})", interval(low, high, "V")),
    };
    Met::No { kind: "", words, why: meeting(circuit, solution, node) }
}

/// The current in the direction that the state implies.
fn magnitude(diode: &DiodeResult) -> Quantity {
    let is_backward = diode.state == State::Breakdown;
    match diode.current {
        Quantity::Known(current) if is_backward => Quantity::Known(-current),
        Quantity::Open(Interval { low, high }) if is_backward => {
            Quantity::Open(Interval { low: -high, high: -low })
        }
        other => other,
    }
}

fn inside(value: Quantity, (low, high): (f64, f64)) -> bool {
    let slack = ROUNDING * low.abs().max(high.abs());
    match value {
        Quantity::Known(value) => value >= low - slack && value <= high + slack,
        Quantity::Open(open) => open.low >= low - slack && open.high <= high + slack,
        Quantity::Unknown => false,
    }
}

/// `conducting 9.1 mA`, `breakdown 14.2 mA`, `blocking`.
fn diode_words(diode: &DiodeResult, range: Option<(f64, f64)>) -> String {
    let state = diode.state.word();
    match (diode.state, magnitude(diode)) {
        (State::Conducting | State::Breakdown, Quantity::Known(current)) => {
            let current = range.map_or_else(|| quantity(current, "A"), |r| apart_from(current, r, "A"));
            format!("{state} {current}")
        }
        (State::Conducting | State::Breakdown | State::Open, Quantity::Open(Interval { low, high })) => {
            format!("{state} with its current left open ({})", interval(low, high, "A"))
        }
        _ => state.to_owned(),
    }
}

/// The value with as many digits as it takes to see that it is outside.
fn apart_from(value: f64, (low, high): (f64, f64), unit: &str) -> String {
    let bound = if value < low { low } else { high };
    operating::apart(value, bound, unit).0
}

/// What the diodes at a node do: `D1 (conducting 4.3 mA) and D2 (blocking) meet there`.
fn meeting(circuit: &Circuit, solution: &Solution, node: NodeId) -> String {
    let touches = |d: &&DiodeResult| circuit.pins(d.element).iter().any(|p| p.node == node);
    let names: Vec<String> = solution
        .diodes
        .iter()
        .filter(touches)
        .map(|d| format!("{} ({})", circuit.element_name(d.element), diode_words(d, None)))
        .collect();
    match names.len() {
        0 => "No diode touches this node: its voltage follows from the sources, resistors and diodes around it."
            .into(),
        1 => format!("At this node stands {}.", super::list(&names)),
        _ => format!("At this node meet {}.", super::list(&names)),
    }
}
