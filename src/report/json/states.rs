//! `kneewise.states`: every diode's state in every condition.

use super::number;
use crate::analysis::Analysis;
use crate::circuit::Circuit;
use crate::operating::{Case, DiodeResult, Interval, Quantity, Solution, State, Trust};
use crate::text::{FileId, Sources};
use serde::Serialize;
use serde::ser::{SerializeMap, Serializer};

#[derive(Serialize)]
struct Document<'a> {
    format: &'static str,
    version: u32,
    file: &'a str,
    cases: Vec<CaseEntry<'a>>,
}

#[derive(Serialize)]
struct CaseEntry<'a> {
    case: &'a str,
    #[serde(serialize_with = "in_order")]
    sources: Vec<(String, Option<f64>)>,
    #[serde(rename = "temperature_C")]
    temperature: Option<f64>,
    verdict: &'static str,
    reason: Option<String>,
    truncated: bool,
    solves: usize,
    residual: ResidualEntry,
    solutions: Vec<SolutionEntry<'a>>,
}

#[derive(Serialize)]
struct ResidualEntry {
    #[serde(rename = "current_A")]
    current: Option<f64>,
    #[serde(rename = "voltage_V")]
    voltage: Option<f64>,
}

#[derive(Serialize)]
struct SolutionEntry<'a> {
    diodes: Vec<DiodeEntry<'a>>,
    nodes: Vec<NodeEntry>,
    branches: Vec<BranchEntry>,
}

/// The ends of an open quantity; `null` where unbounded.
type Ends = (Option<f64>, Option<f64>);

#[derive(Serialize)]
struct DiodeEntry<'a> {
    name: String,
    line: usize,
    file: &'a str,
    state: &'static str,
    #[serde(rename = "voltage_V")]
    voltage: Option<f64>,
    #[serde(rename = "current_A")]
    current: Option<f64>,
    #[serde(rename = "power_W")]
    power: Option<f64>,
    #[serde(rename = "current_range_A")]
    current_range: Option<Ends>,
    #[serde(rename = "voltage_range_V")]
    voltage_range: Option<Ends>,
    #[serde(rename = "drop_V")]
    drop: Option<f64>,
    drop_origin: String,
    #[serde(rename = "open_circuit_V")]
    open_circuit: Option<f64>,
    #[serde(rename = "source_resistance_ohm")]
    source_resistance: Option<f64>,
    #[serde(rename = "margin_V")]
    margin: Option<f64>,
    trust: Option<&'static str>,
    trust_reasons: &'a [String],
    #[serde(rename = "current_error_A")]
    current_error: Option<f64>,
    #[serde(rename = "leakage_bound_A")]
    leakage_bound: Option<f64>,
    refined: Option<Refined>,
}

/// The second opinion by the exponential law.
#[derive(Serialize)]
struct Refined {
    #[serde(rename = "voltage_V")]
    voltage: Option<f64>,
    #[serde(rename = "current_A")]
    current: Option<f64>,
}

#[derive(Serialize)]
struct NodeEntry {
    name: String,
    #[serde(rename = "voltage_V")]
    voltage: Option<f64>,
    #[serde(rename = "range_V")]
    range: Option<Ends>,
    #[serde(rename = "error_V")]
    error: Option<f64>,
    #[serde(rename = "refined_V")]
    refined: Option<f64>,
}

#[derive(Serialize)]
struct BranchEntry {
    name: String,
    #[serde(rename = "current_A")]
    current: Option<f64>,
    #[serde(rename = "range_A")]
    range: Option<Ends>,
}

/// The states of one root file.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
pub fn states(analysis: &Analysis) -> serde_json::Result<String> {
    let cases = analysis.operating.iter().flat_map(|o| &o.cases);
    super::line(&Document {
        format: "kneewise.states",
        version: 1,
        file: analysis.sources.name(FileId(0)),
        cases: cases.map(|case| case_entry(&analysis.circuit, &analysis.sources, case)).collect(),
    })
}

fn case_entry<'a>(circuit: &'a Circuit, sources: &'a Sources, case: &'a Case) -> CaseEntry<'a> {
    let reasons: Vec<&str> = case.causes.iter().map(|c| c.text.as_str()).collect();
    let value = |&(id, value): &(_, f64)| (circuit.element_name(id), number(value));
    let supply = |&(node, volts): &(_, f64)| (circuit.node_name(node), number(volts));
    CaseEntry {
        case: &case.name,
        sources: case.sources.iter().map(value).chain(case.supplies.iter().map(supply)).collect(),
        temperature: number(case.temperature),
        verdict: case.verdict.word(),
        reason: (!reasons.is_empty()).then(|| reasons.join("; ")),
        truncated: case.truncated,
        solves: case.solves,
        residual: ResidualEntry {
            current: number(case.residual.current),
            voltage: number(case.residual.voltage),
        },
        solutions: case.solutions.iter().map(|s| solution_entry(circuit, sources, s)).collect(),
    }
}

fn solution_entry<'a>(
    circuit: &'a Circuit,
    sources: &'a Sources,
    solution: &'a Solution,
) -> SolutionEntry<'a> {
    let node = |n: &crate::operating::NodeResult| {
        let (voltage, range) = parts(n.voltage);
        let (error, refined) = (n.error.and_then(number), n.refined.and_then(number));
        NodeEntry { name: circuit.node_name(n.node), voltage, range, error, refined }
    };
    let branch = |b: &crate::operating::BranchResult| {
        let (current, range) = parts(b.current);
        BranchEntry { name: circuit.element_name(b.element), current, range }
    };
    SolutionEntry {
        diodes: solution.diodes.iter().map(|d| diode_entry(circuit, sources, d)).collect(),
        nodes: solution.nodes.iter().map(node).collect(),
        branches: solution.branches.iter().map(branch).collect(),
    }
}

fn diode_entry<'a>(circuit: &'a Circuit, sources: &'a Sources, diode: &'a DiodeResult) -> DiodeEntry<'a> {
    let span = circuit.element(diode.element).statement;
    let (voltage, voltage_range) = parts(diode.voltage);
    let (current, current_range) = parts(diode.current);
    let blocks = diode.state == State::Blocking;
    let error = diode.error.and_then(|e| number(e.current));
    DiodeEntry {
        name: circuit.element_name(diode.element),
        line: sources.positions(span).0.line,
        file: sources.name(span.file),
        state: diode.state.word(),
        voltage,
        current,
        power: diode.power.and_then(number),
        current_range,
        voltage_range,
        drop: number(diode.drop.volts),
        drop_origin: diode.drop.origin.to_string(),
        open_circuit: diode.view.and_then(|v| number(v.open_circuit)),
        source_resistance: diode.view.and_then(|v| number(v.resistance)),
        margin: diode.margin.and_then(number),
        trust: diode.trust.map(Trust::word),
        trust_reasons: &diode.trust_reasons,
        current_error: error.filter(|_| !blocks),
        leakage_bound: error.filter(|_| blocks),
        refined: diode.refined.map(|r| Refined { voltage: number(r.voltage), current: number(r.current) }),
    }
}

/// The value where it is settled, the ends where it is open, neither where it was not evaluated.
fn parts(quantity: Quantity) -> (Option<f64>, Option<Ends>) {
    match quantity {
        Quantity::Known(value) => (number(value), None),
        Quantity::Open(Interval { low, high }) => (None, Some((number(low), number(high)))),
        Quantity::Unknown => (None, None),
    }
}

/// A map in the order given, which a sorted map would lose.
fn in_order<S: Serializer>(pairs: &[(String, Option<f64>)], serializer: S) -> Result<S::Ok, S::Error> {
    let mut map = serializer.serialize_map(Some(pairs.len()))?;
    for (key, value) in pairs {
        map.serialize_entry(key, value)?;
    }
    map.end()
}
