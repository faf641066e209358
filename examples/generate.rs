//! Writes a large netlist: `cargo run --example generate -- board 100000 > board.cir`. Kinds: `board ELEMENTS` (one
//! element in ten a diode), `grid SIDE`, `ladder SECTIONS`, `random NODES` (half as many diodes), `small COUNT`
//! (independent circuits of ten diodes).

// an example is a program: it may print and stop
#![allow(clippy::print_stderr)]

#[path = "../tests/circuits/mod.rs"]
mod circuits;

use circuits::{Circuit, large};
use std::io::Write;
use std::process::ExitCode;

fn made(kind: &str, size: usize) -> Option<Circuit> {
    match kind {
        "board" => Some(large::board(size)),
        "grid" => Some(large::grid(size)),
        "ladder" => Some(large::ladder(size)),
        "random" => Some(large::sparse(size, size / 2)),
        "small" => Some(large::many_small(size)),
        _ => None,
    }
}

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).collect();
    let circuit = match &words[..] {
        [kind, size] => size.parse().ok().and_then(|size| made(kind, size)),
        _ => None,
    };
    let Some(circuit) = circuit else {
        eprintln!("usage: generate board|grid|ladder|random|small SIZE");
        return ExitCode::from(2);
    };
    match std::io::stdout().write_all(circuit.text().as_bytes()) {
        Ok(()) => ExitCode::SUCCESS,
        Err(_) => ExitCode::from(2),
    }
}
