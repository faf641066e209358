//! Time to the states of large networks: `cargo bench --bench states`. The circuit is in memory when the clock
//! starts; it stops at proved states. Compare with one sparse factorization by `tests/reference/time_factorization.py`.

// a bench is a program
#![allow(clippy::expect_used)]

#[path = "../tests/circuits/mod.rs"]
mod circuits;

use circuits::{Circuit, large};
use divan::Bencher;
use divan::counter::ItemsCount;
use kneewise::circuit;
use kneewise::config::{Options, SecondOpinion};
use kneewise::operating::evaluate;
use kneewise::text::Memory;
use std::path::Path;

fn main() {
    divan::main();
}

fn states(bencher: Bencher, network: &Circuit) {
    let options = Options { states: true, opinion: SecondOpinion::Nowhere, ..Options::default() };
    let mut files = Memory::with("network.cir", network.text());
    let reading =
        circuit::read(&mut files, Path::new("network.cir"), &options).expect("the text is in memory");
    let diodes = network.diodes().count();
    bencher.counter(ItemsCount::new(diodes)).bench_local(|| evaluate(&reading.circuit, None, &options));
}

#[divan::bench(sample_count = 5, sample_size = 1)]
fn grid_300_by_300_with_45000_diodes(bencher: Bencher) {
    states(bencher, &large::grid(300));
}

#[divan::bench(sample_count = 5, sample_size = 1)]
fn ladder_of_100000_sections(bencher: Bencher) {
    states(bencher, &large::ladder(100_000));
}

#[divan::bench(sample_count = 5, sample_size = 1)]
fn random_20000_nodes_with_10000_diodes(bencher: Bencher) {
    states(bencher, &large::sparse(20_000, 10_000));
}

#[divan::bench(sample_count = 5, sample_size = 1)]
fn ten_thousand_circuits_of_ten_diodes(bencher: Bencher) {
    states(bencher, &large::many_small(10_000));
}

#[divan::bench]
fn one_circuit_of_ten_diodes(bencher: Bencher) {
    states(bencher, &large::many_small(1));
}
