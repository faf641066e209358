//! Reading a generated netlist of 1,000,000 lines (about 35 MB), stage by stage: `cargo bench --bench reading`.
//! The floor in the same run is the least that any reader does: lines, words, and a number for each node's name.
//! Ratios to it count, not times.

// a bench is a program
#![allow(clippy::expect_used)]

use kneewise::analysis::analyse;
use kneewise::circuit;
use kneewise::config::Options;
use kneewise::syntax::{self, Fields};
use kneewise::text::Memory;
use rustc_hash::FxHashMap;
use std::fmt::Write as _;
use std::path::Path;
use std::sync::OnceLock;

const LINES: u32 = 1_000_000;

fn main() {
    divan::main();
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

fn whole() -> &'static str {
    static TEXT: OnceLock<String> = OnceLock::new();
    TEXT.get_or_init(|| text(false))
}

#[divan::bench(sample_count = 9, sample_size = 1)]
fn a_floor(bencher: divan::Bencher) {
    let bytes = whole().as_bytes();
    bencher.bench_local(|| {
        let owned = bytes.to_vec();
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
        (nodes.len(), sum)
    });
}

#[divan::bench(sample_count = 9, sample_size = 1)]
fn b_lines_and_words(bencher: divan::Bencher) {
    let text = whole();
    bencher.bench_local(|| {
        let owned = text.to_owned();
        let mut fields = Fields::default();
        let mut words = 0;
        for line in syntax::lines(&owned, true).lines {
            fields.read(&owned, line.start, line.end).expect("every line is whole");
            words += fields.words.len();
        }
        words
    });
}

/// Statements with nodes numbered, values read, models found, instances expanded: at most twice the floor.
#[divan::bench(sample_count = 9, sample_size = 1)]
fn c_read(bencher: divan::Bencher) {
    let mut files = Memory::with("million.cir", whole());
    bencher.bench_local(|| {
        circuit::read(&mut files, Path::new("million.cir"), &Options::default())
            .expect("the text is in memory")
    });
}

/// The whole wiring check: at most five times the floor.
#[divan::bench(sample_count = 9, sample_size = 1)]
fn d_wiring_checked(bencher: divan::Bencher) {
    let mut files = Memory::with("million.cir", whole());
    bencher.bench_local(|| {
        analyse(&mut files, Path::new("million.cir"), &Options::default()).expect("the text is in memory")
    });
}

/// The same where there is much to tell: more than ten thousand findings.
#[divan::bench(sample_count = 5, sample_size = 1)]
fn e_with_loose_ends(bencher: divan::Bencher) {
    let mut files = Memory::with("million.cir", text(true));
    bencher.bench_local(|| {
        analyse(&mut files, Path::new("million.cir"), &Options::default()).expect("the text is in memory")
    });
}
