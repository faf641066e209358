//! Times the states of a large network and writes the linear system of its solution, for a comparison with a sparse
//! factorization elsewhere in one run: `cargo run --release --example timing -- grid|ladder|random FILE`. Writes JSON
//! to standard output and the matrix to FILE, one `row column value` a line.

// an example is a program: it may print and stop
#![allow(clippy::print_stdout, clippy::expect_used, clippy::panic)]

#[path = "../tests/circuits/mod.rs"]
mod circuits;

use circuits::{Circuit, Kind, large};
use kneewise::analysis::analyse;
use kneewise::circuit::{self, State};
use kneewise::config::{Options, SecondOpinion};
use kneewise::operating::{Case, evaluate};
use kneewise::text::Memory;
use std::collections::HashMap;
use std::fmt::Write;
use std::path::Path;
use std::time::Instant;

fn main() {
    let mut words = std::env::args().skip(1);
    let kind = words.next().expect("a kind");
    let file = words.next().expect("a file");
    let network = match kind.as_str() {
        "grid" => large::grid(300),
        "ladder" => large::ladder(100_000),
        "random" => large::sparse(20_000, 10_000),
        other => panic!("no network of the kind {other}"),
    };
    let text = network.text();
    let options = Options { states: true, opinion: SecondOpinion::Nowhere, ..Options::default() };
    let whole = Instant::now();
    let mut files = Memory::with("network.cir", text.as_bytes());
    let analysis = analyse(&mut files, Path::new("network.cir"), &options).expect("the text is in memory");
    let whole = whole.elapsed().as_secs_f64();
    let reading =
        circuit::read(&mut files, Path::new("network.cir"), &options).expect("the text is in memory");
    let mut times: Vec<f64> = (0..5)
        .map(|_| {
            let start = Instant::now();
            let result = evaluate(&reading.circuit, None, &options);
            let seconds = start.elapsed().as_secs_f64();
            drop(result);
            seconds
        })
        .collect();
    times.sort_by(f64::total_cmp);
    let case = analysis.operating.as_ref().and_then(|o| o.cases.first()).expect("a nominal case");
    let conducting = conducting(case, |id| analysis.circuit.element_name(id));
    let (size, matrix) = linear_system(&network, &conducting);
    std::fs::write(&file, matrix).expect("the matrix can be written");
    println!(
        "{}",
        serde_json::json!({
            "kind": kind, "size": size, "solve_s": times[times.len() / 2], "best_s": times[0], "whole_s": whole,
            "solves": case.solves, "verdict": format!("{:?}", case.verdict),
            "residual": case.residual.relative, "diodes": conducting.len(),
        })
    );
}

/// Which diodes carry current, by name.
fn conducting(case: &Case, name: impl Fn(circuit::ElementId) -> String) -> HashMap<String, bool> {
    let diodes = case.solutions.iter().flat_map(|solution| &solution.diodes);
    diodes.map(|d| (name(d.element), matches!(d.state, State::Conducting | State::Breakdown))).collect()
}

/// Modified nodal analysis (Ho, Ruehli & Brennan 1975) with the diodes in their states: a row for every node, every
/// voltage source and every diode that carries current.
fn linear_system(network: &Circuit, conducting: &HashMap<String, bool>) -> (usize, String) {
    let mut size = network.nodes.len() - 1;
    let mut text = String::new();
    let mut put = |row: usize, column: usize, value: f64| {
        let _ = writeln!(text, "{row} {column} {value:e}");
    };
    for element in &network.elements {
        let ends: Vec<(usize, f64)> =
            [(element.from, 1.0), (element.to, -1.0)].into_iter().filter(|e| e.0 > 0).collect();
        let series = match &element.kind {
            Kind::R(ohms) => {
                for (row, a) in &ends {
                    for (column, b) in &ends {
                        put(row - 1, column - 1, a * b / ohms.float());
                    }
                }
                continue;
            }
            Kind::V(_) => 0.0,
            Kind::D(diode) if conducting.get(&element.name) == Some(&true) => diode.series.float(),
            _ => continue,
        };
        for (node, sign) in &ends {
            put(node - 1, size, *sign);
            put(size, node - 1, *sign);
        }
        if series != 0.0 {
            put(size, size, -series);
        }
        size += 1;
    }
    (size, text)
}
