//! Reading a generated netlist of 1,000,000 lines (about 35 MB), stage by stage: `cargo bench --bench reading`.
//! The floor in the same run is the least that any reader does: lines, words, and a number for each node's name.
//! Ratios to it count, not times: the median over rounds in which each stage runs once. Reading is to take at most twice
//! the floor, the whole wiring check five times.

// a bench is a program
#![allow(clippy::expect_used, clippy::print_stdout)]

use kneewise::analysis::analyse;
use kneewise::circuit;
use kneewise::config::Options;
use kneewise::syntax::{self, Fields};
use kneewise::text::Memory;
use rustc_hash::FxHashMap;
use std::fmt::Write as _;
use std::hint::black_box;
use std::path::Path;
use std::time::Instant;

const LINES: u32 = 1_000_000;

/// Rounds; each runs every stage once, so that what else the machine does falls on all of them.
const ROUNDS: usize = 9;

/// Name, text, and what is done with it.
type Stage<'a> = (&'a str, &'a str, fn(&str) -> usize);

fn main() {
    // asked by `cargo test` whether there are tests in here
    if std::env::args().any(|argument| argument == "--test" || argument == "--list") {
        return;
    }
    let (clean, loose) = (text(false), text(true));
    let stages: [Stage<'_>; 5] = [
        ("floor", &clean, floor),
        ("lines and words", &clean, words),
        ("read: nodes, values, models, instances", &clean, read),
        ("wiring checked", &clean, check),
        ("wiring checked, 10,000 loose ends", &loose, check),
    ];
    let only = std::env::args().skip(1).find(|argument| !argument.starts_with("--"));
    let mut times = vec![Vec::new(); stages.len()];
    for _ in 0..ROUNDS {
        for ((name, text, stage), times) in stages.iter().zip(&mut times) {
            if only.as_ref().is_none_or(|only| name.contains(only.as_str())) {
                let start = Instant::now();
                black_box(stage(black_box(text)));
                times.push(start.elapsed().as_secs_f64());
            }
        }
    }
    println!("{:42}{:>10}{:>10}{:>22}", "", "fastest", "median", "times the floor");
    for ((name, ..), own) in stages.iter().zip(&times).filter(|(_, own)| !own.is_empty()) {
        let ratios: Vec<f64> = own.iter().zip(&times[0]).map(|(own, floor)| own / floor).collect();
        let fastest = own.iter().copied().fold(f64::INFINITY, f64::min);
        println!("{name:42}{fastest:9.3}s{:9.3}s{:22.2}", median(own), median(&ratios));
    }
}

fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied().unwrap_or(f64::NAN)
}

/// Random links over as many nodes as real netlists have, two fifths of the elements; every node is touched at
/// least twice, so that a wiring check has next to nothing to tell. With `loose`, one node in thirty ends in the air.
fn text(loose: bool) -> String {
    let mut text = String::from("a million lines\n.model DBUOY D(IS=2.5n N=1.75 RS=0.57)\n");
    text.push_str(".subckt CELL p n\nRS p m 10\nDS m n DBUOY\n.ends\n");
    let mut state = 0x2545_F491_4F6C_DD1D_u64;
    let mut random = |below: u32| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        ((state >> 33) % u64::from(below)) as u32
    };
    let nodes = LINES * 2 / 5;
    for n in 0..LINES - 6 {
        let a = if loose { random(nodes) } else { n % nodes };
        let (b, whole, part) = (random(nodes), 1 + random(99), random(10));
        let line = match random(20) {
            0..10 => write!(text, "R{n} buoy_n{a} buoy_n{b} {whole}.{part}k"),
            10..14 => write!(text, "C{n} buoy_n{a} buoy_n{b} {whole}.{part}u"),
            14..18 => write!(text, "D{n} buoy_n{a} buoy_n{b} DBUOY"),
            18 => write!(text, "V{n} buoy_n{a} buoy_n{b} DC {whole}.{part}"),
            _ => write!(text, "X{n} buoy_n{a} buoy_n{b} CELL"),
        };
        line.expect("writing to a string");
        text.push('\n');
    }
    text.push_str("RGROUND buoy_n0 0 1\n.end\n");
    text
}

/// Bytes, lines, words, and a number for each node's name.
fn floor(text: &str) -> usize {
    let owned = text.as_bytes().to_vec();
    let mut nodes: FxHashMap<&[u8], u32> = FxHashMap::default();
    let mut start = 0;
    let mut sum = 0u64;
    for end in memchr::memchr_iter(b'\n', &owned) {
        let words = owned[start..end].split(u8::is_ascii_whitespace).filter(|w| !w.is_empty());
        for (n, word) in words.enumerate() {
            if n == 1 || n == 2 {
                let next = nodes.len() as u32;
                sum += u64::from(*nodes.entry(word).or_insert(next));
            }
        }
        start = end + 1;
    }
    black_box(sum);
    nodes.len()
}

fn words(text: &str) -> usize {
    let owned = text.to_owned();
    let mut fields = Fields::default();
    let mut words = 0;
    for line in syntax::lines(&owned, true).lines {
        fields.read(&owned, line.start, line.end).expect("every line is whole");
        words += fields.words.len();
    }
    words
}

const FILE: &str = "million.cir";

fn read(text: &str) -> usize {
    let mut files = Memory::with(FILE, text);
    let reading =
        circuit::read(&mut files, Path::new(FILE), &Options::default()).expect("the text is in memory");
    reading.circuit.elements.len()
}

fn check(text: &str) -> usize {
    let mut files = Memory::with(FILE, text);
    let analysis = analyse(&mut files, Path::new(FILE), &Options::default()).expect("the text is in memory");
    analysis.findings.len()
}
