//! Steps over time: `cargo bench --bench swing`. A bridge rectifier with reservoir (items are steps), and multipliers of
//! growing length, whose time for each step should grow with their length and no faster. The ratio to SciPy's Radau method
//! is measured by `tests/reference/time_swing.py`.

// a bench is a program
#![allow(clippy::expect_used)]

use divan::Bencher;
use divan::counter::ItemsCount;
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::text::Memory;
use std::fmt::Write as _;
use std::path::Path;

fn main() {
    divan::main();
}

fn follow(netlist: &str) -> Analysis {
    let mut files = Memory::with("network.cir", netlist.as_bytes());
    let options = Options { states: true, swing: true, ..Options::default() };
    analyse(&mut files, Path::new("network.cir"), &options).expect("the netlist is in memory")
}

fn steps(bencher: Bencher<'_, '_>, netlist: &str) {
    let effort = follow(netlist).swing.expect("it was asked for").effort;
    bencher.counter(ItemsCount::new(effort.steps as usize)).bench_local(|| follow(netlist));
}

#[divan::bench]
fn bridge_with_reservoir_for_500_periods(bencher: Bencher<'_, '_>) {
    steps(
        bencher,
        "t\nV1 p n SIN(0 16.9706 50)\nD1 p out DX\nD2 n out DX\nD3 0 p DX\nD4 0 n DX\nC1 out 0 1000u\nR1 out 0 150\n\
         .tran 10u 10\n.model DX D\n*@ drop DX 0.7\n",
    );
}

/// A cascade of so many stages for a quarter of a period.
fn cascade(stages: usize) -> String {
    let mut netlist = String::from("t\nV1 a0 0 SIN(0 100 1k)\n");
    for k in 1..=stages {
        let below = if k == 1 { "0".to_owned() } else { format!("b{}", k - 1) };
        let _ = writeln!(netlist, "CA{k} a{} a{k} 1u\nDA{k} {below} a{k} DX", k - 1);
        let _ = writeln!(netlist, "DB{k} a{k} b{k} DX\nCB{k} {below} b{k} 1u");
    }
    let _ = writeln!(netlist, "R1 b{stages} 0 10meg\n.tran 1u 250u\n.model DX D(RS=5)\n*@ drop DX 0.7");
    netlist
}

#[divan::bench(args = [125, 250, 500, 1000], sample_count = 3, sample_size = 1)]
fn multiplier_of_stages(bencher: Bencher<'_, '_>, stages: usize) {
    steps(bencher, &cascade(stages));
}
