//! What must hold for marks and comparisons of any file: marks put and taken away leave the file as it was, byte for byte;
//! putting them twice is putting them once; a file compared with itself, its nodes renamed and its lines in another order,
//! shows nothing.

use crate::files::grammar;
use crate::properties::{any_text, broken, fixtures, netlist, random_circuit};
use crate::seed::Seed;
use crate::sentence::Maker;
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::review::{Comparison, Revision, annotate, compare, strip};
use kneewise::rules;
use kneewise::text::{Memory, decode};
use std::path::Path;

fn options() -> Options {
    Options { states: true, ..Options::default() }
}

fn check(bytes: &[u8]) -> Analysis {
    analyse(&mut Memory::with("a.net", bytes), Path::new("a.net"), &options()).unwrap()
}

/// Puts marks into a file and holds the promises; says how many there are.
fn marks_keep_their_promises(bytes: &[u8]) -> usize {
    let bare = strip(bytes);
    let once = annotate(&check(bytes), bytes);
    let shown = || format!("\n{:?}\n{:?}", decode(bytes).0, decode(once.bytes.as_slice()).0);
    assert_eq!(strip(&once.bytes), bare, "{}", shown());
    let twice = annotate(&check(&once.bytes), &once.bytes);
    assert!(twice.changes.is_empty() && twice.bytes == once.bytes, "{:?}{}", twice.changes, shown());
    if !decode(bytes).0.contains(";@") {
        assert_eq!(bare, bytes, "{}", shown());
    }
    once.marks
}

/// The text in some encoding, with some line ends.
fn encoded(text: &str, seed: &mut Seed) -> Vec<u8> {
    let text = match seed.below(4) {
        0 => text.replace("\r\n", "\n").replace('\n', "\r"),
        1 => text.replace("\r\n", "\n").replace('\n', "\r\n"),
        _ => text.to_owned(),
    };
    match seed.below(5) {
        0 => [0xEF, 0xBB, 0xBF].iter().chain(text.as_bytes()).copied().collect(),
        1 => [0xFF, 0xFE].into_iter().chain(text.encode_utf16().flat_map(u16::to_le_bytes)).collect(),
        2 => [0xFE, 0xFF].into_iter().chain(text.encode_utf16().flat_map(u16::to_be_bytes)).collect(),
        3 => text.chars().map(|c| u8::try_from(u32::from(c)).unwrap_or(b'?')).collect(),
        _ => text.into_bytes(),
    }
}

#[test]
fn marks_put_and_taken_away_leave_every_byte() {
    let grammar = grammar();
    let mut maker = Maker::new(&grammar, 31);
    let mut seed = Seed(32);
    let mut marks = 0;
    let mut texts = fixtures();
    texts.extend(broken().into_iter().filter(|b| b.len() < 3000));
    texts.extend(rules::all().iter().map(|r| r.failing.as_bytes().to_vec()));
    for text in &texts {
        marks += marks_keep_their_promises(text);
        let wide = encoded(&String::from_utf8_lossy(text), &mut seed);
        marks += marks_keep_their_promises(&wide);
    }
    for _ in 0..80 {
        let sentence = maker.sentence("netlist").text;
        marks += marks_keep_their_promises(&encoded(&sentence, &mut seed));
    }
    for _ in 0..250 {
        marks += marks_keep_their_promises(&any_text(&texts, &mut seed));
    }
    assert!(marks > 200, "{marks} marks were put");
}

#[test]
fn marks_that_stand_already_are_put_right() {
    let mut seed = Seed(33);
    let tails = [
        " ;@ blocking",
        " ;@ conducting 1.00mA 0.700V",
        " ; note ;@ open",
        "\t;@",
        " ;@todo",
        " $ x ;@ open ",
    ];
    for text in fixtures() {
        let text = String::from_utf8(text).unwrap();
        let lines = text.split_inclusive('\n').map(|line| {
            let (body, end) = line.split_at(line.trim_end_matches(['\r', '\n']).len());
            let tail = if seed.chance(30) { seed.pick(&tails) } else { "" };
            format!("{body}{tail}{end}")
        });
        let marked: String = lines.collect();
        marks_keep_their_promises(marked.as_bytes());
    }
}

fn compared(old: &[u8], new: &[u8]) -> Comparison {
    let (mut before, mut after) = (Memory::with("a.net", old), Memory::with("a.net", new));
    let options = options();
    let path = Path::new("a.net");
    compare(
        Revision { loader: &mut before, root: path, options: &options },
        Revision { loader: &mut after, root: path, options: &options },
    )
    .unwrap()
}

#[test]
fn a_file_compared_with_itself_shows_nothing() {
    let mut texts = fixtures();
    texts.extend(broken().into_iter().filter(|b| b.len() < 3000));
    texts.extend(rules::all().iter().flat_map(|r| [r.failing, r.passing]).map(|t| t.as_bytes().to_vec()));
    let mut seed = Seed(34);
    let random: Vec<Vec<u8>> = (0..80).map(|_| any_text(&texts, &mut seed)).collect();
    for text in texts.iter().chain(&random) {
        let comparison = compared(text, text);
        assert!(comparison.is_empty(), "{}\n{comparison:?}", String::from_utf8_lossy(text));
    }
}

#[test]
fn renamed_nodes_and_shuffled_lines_show_nothing() {
    let mut seed = Seed(35);
    let plain: Vec<String> = ["0", "in", "out", "mid", "sense", "rail", "tap"].map(str::to_owned).to_vec();
    let other: Vec<String> =
        ["0", "zwölf/7", "+24V", "a[3]", "<probe>", "LONGER_NAME", "q.y#2"].map(str::to_owned).to_vec();
    for _ in 0..150 {
        let mut lines = random_circuit(&mut seed);
        let old = netlist(&lines, &plain);
        seed.shuffle(&mut lines);
        let new = netlist(&lines, &other);
        let comparison = compared(old.as_bytes(), new.as_bytes());
        let told = comparison.states.len() + comparison.wiring.len() + comparison.verdicts.len();
        let moved = comparison.currents.len() + comparison.voltages.len();
        assert_eq!((told, moved), (0, 0), "\n{old}\n{new}\n{comparison:?}");
    }
}
