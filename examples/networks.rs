//! Writes random networks as JSON lines, for references outside Rust:
//! `cargo run --example networks -- [--first SEED] COUNT` (small ones, every verdict), or
//! `… -- --diodes 12..40 COUNT` (connected ones), or `… -- --families`. `--exact` adds the answer of the tests' own enumeration, so that
//! it can be held against those references too.

// an example is a program: it may print and stop
#![allow(clippy::print_stdout, clippy::expect_used, clippy::panic)]

#[path = "../tests/circuits/mod.rs"]
mod circuits;
#[path = "../tests/oracle/mod.rs"]
mod oracle;

use circuits::{Circuit, Kind};
use oracle::{Range, Verdict, float};
use serde_json::{Map, Value, json};

struct Request {
    exact: bool,
    first: u64,
    count: u64,
    diodes: Option<(usize, usize)>,
    families: bool,
}

fn request() -> Request {
    let mut request = Request { exact: false, first: 0, count: 100, diodes: None, families: false };
    let mut words = std::env::args().skip(1);
    while let Some(word) = words.next() {
        let mut next = || words.next().expect("a value follows");
        match word.as_str() {
            "--exact" => request.exact = true,
            "--families" => request.families = true,
            "--first" => request.first = next().parse().expect("a seed"),
            "--diodes" => {
                let text = next();
                let (low, high) = text.split_once("..").expect("LOW..HIGH");
                request.diodes = Some((low.parse().expect("a number"), high.parse().expect("a number")));
            }
            count => request.count = count.parse().expect("a count"),
        }
    }
    request
}

fn circuits(request: &Request) -> Box<dyn Iterator<Item = Circuit> + '_> {
    if request.families {
        return Box::new(families());
    }
    Box::new((request.first..request.first + request.count).map(|seed| match request.diodes {
        Some((low, high)) => {
            let span = (high - low) as u64 + 1;
            circuits::random::connected(seed, low + usize::try_from(seed * 7 % span).unwrap_or(0))
        }
        None => circuits::random::network(seed),
    }))
}

fn families() -> impl Iterator<Item = Circuit> {
    use circuits::families::{bridges, gates, grid, ladder, multiplier, ring};
    let size = |seed: u64| usize::try_from(seed).unwrap_or(0);
    let ladders = (0..12).map(move |seed| ladder(5 + 3 * size(seed), seed));
    let nested =
        (1..=7).flat_map(|depth| [bridges(depth, 40, &[700]), bridges(depth, -40, &[700, 300, 1000])]);
    let trees = (1..=5).flat_map(|depth| (0..6).map(move |seed| gates(depth, seed)));
    let resting = [1, 2, 5, 12, 22].map(|stages| multiplier(stages, true));
    let rings = (0..12).map(move |seed| ring(2 + 3 * size(seed), seed));
    let grids = (0..6).map(move |seed| grid(3 + size(seed) / 2, seed));
    ladders.chain(nested).chain(trees).chain(resting).chain(rings).chain(grids)
}

fn main() {
    let request = request();
    for (number, circuit) in circuits(&request).enumerate() {
        let seed = request.first + number as u64;
        let mut line = json!({
            "seed": seed, "text": circuit.text(), "nodes": circuit.nodes, "elements": elements(&circuit),
        });
        if request.exact {
            line["answer"] = exact(&circuit);
        }
        println!("{line}");
    }
}

fn elements(circuit: &Circuit) -> Vec<Value> {
    let one = |element: &circuits::Element| {
        let mut value = json!({"name": element.name, "from": element.from, "to": element.to});
        match &element.kind {
            Kind::R(v) | Kind::V(v) | Kind::I(v) => value["value"] = json!(v.float()),
            Kind::D(diode) => {
                value["drop"] = json!(diode.drop.float());
                value["breakdown"] = json!(diode.breakdown.map(|b| b.float()));
                value["series"] = json!(diode.series.float());
            }
            _ => {}
        }
        value
    };
    circuit.elements.iter().map(one).collect()
}

/// A range as `[low, high]`, `null` for an end that is unbounded.
fn ends(range: &Range) -> Value {
    json!([range.low.as_ref().map(float), range.high.as_ref().map(float)])
}

fn exact(circuit: &Circuit) -> Value {
    let answer = oracle::solve(circuit);
    let verdicts = oracle::acceptable_verdicts(circuit, &answer);
    let verdict = match verdicts.last() {
        Some(Verdict::Unique) => "unique",
        Some(Verdict::Shared) => "shared",
        Some(Verdict::Floating) => "floating",
        Some(Verdict::SharedFloating) => "shared+floating",
        Some(Verdict::Several) => "several",
        Some(Verdict::None) | None => "none",
    };
    let (mut states, mut currents, mut potentials) = (Map::new(), Map::new(), Map::new());
    if answer.solvable() {
        for (at, _) in circuit.diodes() {
            let name = circuit.elements[at].name.clone();
            states.insert(name.clone(), json!(format!("{:?}", answer.current(at).state()).to_lowercase()));
            currents.insert(name, ends(answer.current(at)));
        }
        for node in 1..circuit.nodes.len() {
            potentials.insert(circuit.nodes[node].clone(), ends(answer.potential(node)));
        }
    }
    json!({"verdict": verdict, "states": states, "currents": currents, "potentials": potentials})
}
