//! What must hold for any text: no panic, places inside their files, nothing that hangs on the order of the lines or
//! on the names of the nodes, and a circuit that survives being printed and read again.

use crate::files::{folder, grammar};
use crate::printer::print;
use crate::seed::Seed;
use crate::sentence::Maker;
use kneewise::analysis::{Analysis, analyse};
use kneewise::circuit::{self, Circuit};
use kneewise::config::Options;
use kneewise::finding::Finding;
use kneewise::rules::{self, Group};
use kneewise::text::{Memory, Sources, Span};
use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::path::Path;

fn check(bytes: &[u8], states: bool) -> Analysis {
    let options = Options { states, ..Options::default() };
    analyse(&mut Memory::with("a.net", bytes), Path::new("a.net"), &options).unwrap()
}

/// The files of a folder that end in `.net`, in order.
fn netlists(folder: &Path) -> Vec<Vec<u8>> {
    let mut paths: Vec<_> = std::fs::read_dir(folder).unwrap().map(|e| e.unwrap().path()).collect();
    paths.retain(|p| p.extension().is_some_and(|e| e == "net"));
    paths.sort();
    paths.iter().map(|p| std::fs::read(p).unwrap()).collect()
}

pub fn fixtures() -> Vec<Vec<u8>> {
    netlists(&folder().parent().unwrap().join("fixtures"))
}

pub fn broken() -> Vec<Vec<u8>> {
    netlists(&folder().join("broken"))
}

fn spans_of(finding: &Finding) -> impl Iterator<Item = Span> + '_ {
    let edits = finding.fix.iter().flat_map(|f| &f.edits).map(|e| e.span);
    let labels = finding.labels.iter().map(|l| l.span);
    let trail = finding.trail.iter().map(|t| t.span);
    std::iter::once(finding.span).chain(edits).chain(labels).chain(trail)
}

fn assert_inside(sources: &Sources, span: Span, what: &str) {
    let file = sources.get(span.file).unwrap_or_else(|| panic!("{what}: no such file"));
    let inside = span.start <= span.end && file.text.get(span.range()).is_some();
    assert!(inside, "{what}: {span:?} in a text of {} bytes", file.text.len());
}

fn assert_places(analysis: &Analysis) {
    let sources = &analysis.sources;
    for finding in &analysis.findings {
        for span in spans_of(finding) {
            assert_inside(sources, span, finding.rule);
        }
    }
    for (id, element) in analysis.circuit.elements() {
        assert_inside(sources, element.statement, "a statement");
        let name = analysis.circuit.name_span(id);
        assert_inside(sources, name, "a name");
        assert!(sources.slice(name).eq_ignore_ascii_case(analysis.circuit.text(element.name)));
        for pin in analysis.circuit.pins(id) {
            assert_inside(sources, pin.span, "a node");
        }
    }
    for note in &analysis.circuit.notes {
        assert_inside(sources, note.span, "a note");
        assert_inside(sources, note.subject_span, "a note's subject");
    }
}

/// A text with a few bytes changed, dropped, doubled, or put in from another.
fn mutated(bytes: &[u8], other: &[u8], seed: &mut Seed) -> Vec<u8> {
    let mut out = bytes.to_vec();
    for _ in 0..seed.between(1, 8) {
        let at = seed.below(out.len() + 1);
        let end = (at + seed.below(12)).min(out.len());
        match seed.below(5) {
            0 => drop(out.drain(at..end)),
            1 => out.insert(at, seed.below(256) as u8),
            2 => out.insert(at, *seed.pick(b"\n+*{}'\"().,;$=@ \t\r:-0")),
            3 => {
                let copy = out[at..end].to_vec();
                out.splice(at..at, copy);
            }
            _ => {
                let from = seed.below(other.len() + 1);
                let to = (from + seed.below(40)).min(other.len());
                out.splice(at..at, other[from..to].iter().copied());
            }
        }
    }
    out
}

/// Random bytes, random characters that mean something, and mutations of what is nearly right.
pub fn any_text(seeds: &[Vec<u8>], seed: &mut Seed) -> Vec<u8> {
    match seed.below(6) {
        0 => (0..seed.below(300)).map(|_| seed.below(256) as u8).collect(),
        1 => {
            let letters = b"RCLVIDQEFGHKX*+.@{}()'\"=,;$ \n\n\n019kmMu-ab\t\r\xB5\xC2\xA0\xFF\0";
            (0..seed.below(400)).map(|_| *seed.pick(letters)).collect()
        }
        _ => {
            let (one, other) = (seed.below(seeds.len()), seed.below(seeds.len()));
            mutated(&seeds[one], &seeds[other], seed)
        }
    }
}

#[test]
fn no_text_makes_it_panic_and_every_place_is_inside_its_file() {
    let mut seeds = fixtures();
    seeds.extend(broken().into_iter().filter(|b| b.len() < 3000));
    let grammar = grammar();
    let mut maker = Maker::new(&grammar, 23);
    seeds.extend((0..60).map(|_| maker.sentence("netlist").text.into_bytes()));
    let mut seed = Seed(20);
    for _ in 0..5000 {
        assert_places(&check(&any_text(&seeds, &mut seed), false));
    }
    for _ in 0..1000 {
        assert_places(&check(&any_text(&seeds, &mut seed), true));
    }
}

/// Element lines of a random circuit, nodes by number: sound and unsound ones, diodes in any direction. Sources close
/// at most one loop of their own: of several, a finding names one of several equally good descriptions.
pub fn random_circuit(seed: &mut Seed) -> Vec<(String, [usize; 2], String)> {
    let nodes = seed.between(3, 7);
    let mut group: Vec<usize> = (0..nodes).collect();
    let (mut lines, mut loops) = (Vec::new(), 0);
    for number in 0..seed.between(4, 14) {
        let first = seed.below(nodes);
        let ends = [first, if seed.chance(4) { first } else { (first + seed.between(1, nodes - 1)) % nodes }];
        let (letter, value) = match seed.below(9) {
            0 | 1 => ('V', format!("{}", seed.between(1, 12))),
            2..=4 => ('R', format!("{}", 100 * seed.between(1, 99))),
            5 => ('C', "1u".to_owned()),
            6 => ('I', format!("{}m", seed.between(1, 9))),
            _ => ('D', seed.pick(&["DX", "DY"]).to_string()),
        };
        if letter == 'V' {
            let (from, to) = (group[ends[0]], group[ends[1]]);
            loops += usize::from(from == to);
            if from == to && loops > 1 {
                continue;
            }
            group.iter_mut().filter(|g| **g == from).for_each(|g| *g = to);
        }
        lines.push((format!("{letter}{number}"), ends, value));
    }
    lines
}

const MODELS: &str = ".model DX D(IS=1n N=1.8)\n.model DY D(IS=10f BV=5)\n.end\n";

pub fn netlist(lines: &[(String, [usize; 2], String)], names: &[String]) -> String {
    let mut text = String::from("random circuit\n");
    for (name, [a, b], value) in lines {
        writeln!(text, "{name} {} {} {value}", names[*a], names[*b]).unwrap();
    }
    text + MODELS
}

/// Rules that speak of a group of nodes or elements by the first of them in the text.
const OF_A_GROUP: [&str; 5] =
    ["no-ground", "unheld-node", "floating-part", "open-potential", "current-without-return"];

/// Findings by rule and subjects, subjects in alphabetical order, and the states of all diodes in all conditions.
fn essence(analysis: &Analysis, rename: &BTreeMap<String, String>) -> Vec<String> {
    let renamed = |name: &String| rename.get(name).cloned().unwrap_or_else(|| name.clone());
    let mut lines = Vec::new();
    // where nothing is consistent, one cause of perhaps several is told
    let contradictory = analysis.operating.iter().flat_map(|o| &o.cases).any(|c| !c.causes.is_empty());
    let is_judged = |f: &&Finding| {
        let rule = rules::find(f.rule).unwrap_or_else(|| panic!("no rule {}", f.rule));
        !(contradictory && rule.group == Group::States)
    };
    for finding in analysis.findings.iter().filter(is_judged) {
        let mut subjects: Vec<String> = finding.subjects.iter().map(renamed).collect();
        if finding.rule == "forward-across-source" {
            // behind the diode stands one of perhaps several ways round
            subjects.truncate(1);
        }
        subjects.sort();
        if OF_A_GROUP.contains(&finding.rule) {
            subjects.clear();
        }
        lines.push(format!("{} {}", finding.rule, subjects.join(" ")));
    }
    for case in analysis.operating.iter().flat_map(|o| &o.cases) {
        lines.push(format!("{} {:?}", case.name, case.verdict));
        for (number, solution) in case.solutions.iter().enumerate() {
            for diode in &solution.diodes {
                let name = analysis.circuit.element_name(diode.element);
                lines.push(format!("{} {number} {name} {}", case.name, diode.state.word()));
            }
        }
    }
    lines.sort();
    lines
}

#[test]
fn neither_the_order_of_lines_nor_the_names_of_nodes_matter() {
    let mut seed = Seed(21);
    let plain: Vec<String> = ["0", "in", "out", "mid", "sense", "rail", "tap"].map(str::to_owned).to_vec();
    // the same in what the rules look at in names: nothing resembles another, and none says what it stands at
    let other: Vec<String> =
        ["0", "zwölf/7", "+pin24", "a[3]", "<probe>", "LONGER_NAME", "q.y#2"].map(str::to_owned).to_vec();
    let back: BTreeMap<String, String> = other.iter().cloned().zip(plain.iter().cloned()).collect();
    for _ in 0..400 {
        let mut lines = random_circuit(&mut seed);
        let text = netlist(&lines, &plain);
        let first = essence(&check(text.as_bytes(), true), &BTreeMap::new());
        let renamed = netlist(&lines, &other);
        assert_eq!(first, essence(&check(renamed.as_bytes(), true), &back), "\n{text}\n{renamed}");
        seed.shuffle(&mut lines);
        let shuffled = netlist(&lines, &plain);
        assert_eq!(
            first,
            essence(&check(shuffled.as_bytes(), true), &BTreeMap::new()),
            "\n{text}\n{shuffled}"
        );
    }
}

fn read(bytes: &[u8]) -> Circuit {
    let mut files = Memory::with("a.net", bytes);
    circuit::read(&mut files, Path::new("a.net"), &Options::default()).unwrap().circuit
}

#[test]
fn a_circuit_survives_being_printed_and_read_again() {
    let grammar = grammar();
    let mut maker = Maker::new(&grammar, 22);
    let mut texts = fixtures();
    texts.extend(broken());
    texts.extend(rules::all().iter().flat_map(|r| [r.failing, r.passing]).map(|t| t.as_bytes().to_vec()));
    texts.extend((0..200).map(|_| maker.sentence("netlist").text.into_bytes()));
    let mut elements = 0;
    for text in texts {
        let first = read(&text);
        elements += first.elements.len();
        let printed = print(&first);
        let second = read(printed.as_bytes());
        assert_eq!(printed, print(&second), "\n{}", String::from_utf8_lossy(&text));
        let counts = |c: &Circuit| (c.elements.len(), c.transient, c.initial.len());
        assert_eq!(counts(&first), counts(&second), "\n{printed}");
    }
    assert!(elements > 500, "{elements} elements were tried");
}
