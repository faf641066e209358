//! What a netlist takes in memory, stage by stage, as bytes for each element: `cargo run --release --example memory --
//! FILE`. Read from what the system says about this process, so it runs on Linux only.

// an example is a program: it may print and stop
#![allow(clippy::print_stdout, clippy::expect_used)]

use kneewise::circuit;
use kneewise::config::Options;
use kneewise::text::Disk;
use kneewise::topology::Wiring;
use std::path::Path;

/// Resident bytes now and at the peak so far.
fn resident() -> (f64, f64) {
    let status = std::fs::read_to_string("/proc/self/status").expect("a system that tells");
    let kilobytes = |key: &str| {
        let line = status.lines().find(|line| line.starts_with(key)).expect("a known key");
        let number = line.split_whitespace().nth(1).and_then(|word| word.parse::<f64>().ok());
        number.expect("a number") * 1024.0
    };
    (kilobytes("VmRSS:"), kilobytes("VmHWM:"))
}

fn main() {
    let file = std::env::args().nth(1).expect("a file");
    let text = std::fs::metadata(&file).expect("its size").len() as f64;
    let start = resident().0;
    let reading = circuit::read(&mut Disk, Path::new(&file), &Options::default()).expect("a readable file");
    let elements = reading.circuit.elements.len() as f64;
    let read = resident();
    let wiring = Wiring::of(&reading.circuit);
    let wired = resident();
    println!("{elements} elements, {:.0} bytes of text each", text / elements);
    println!(
        "flat circuit and statements {:.0}, at the peak {:.0}",
        (read.0 - start - text) / elements,
        (read.1 - start - text) / elements
    );
    println!("facts of the wiring {:.0}", (wired.0 - read.0) / elements);
    println!(
        "in all, text included, {:.0}, at the peak {:.0}",
        (wired.0 - start) / elements,
        (wired.1 - start) / elements
    );
    drop(wiring);
}
