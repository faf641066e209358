//! What the grammar makes, the reader takes: statements and whole files, in every encoding and with every line end.

use crate::abnf::Grammar;
use crate::files::{folder, grammar};
use crate::seed::Seed;
use crate::sentence::{Maker, Sentence};
use kneewise::circuit::{self, Reading};
use kneewise::config::Options;
use kneewise::rules;
use kneewise::syntax;
use kneewise::text::Memory;
use std::path::Path;

/// Rules that say that something was not read as what it is.
const UNREADABLE: [&str; 12] = [
    "unreadable-line",
    "unreadable-expression",
    "unreadable-note",
    "unknown-element",
    "unknown-dot-line",
    "stray-continuation",
    "stray-ends",
    "unclosed-subcircuit",
    "decimal-comma",
    "limit-reached",
    "wrong-model-type",
    "include-cycle",
];

fn read(bytes: &[u8]) -> Reading {
    let mut files = Memory::with("a.net", bytes);
    circuit::read(&mut files, Path::new("a.net"), &Options::default()).unwrap()
}

/// What was not read in a file, told for a person; empty where all was.
fn complaints(reading: &Reading) -> String {
    let lines = reading.findings.iter().filter(|f| UNREADABLE.contains(&f.rule)).map(|f| {
        let line = reading.sources.positions(f.span).0.line;
        format!("{} in line {line}: {}\n", f.rule, f.message)
    });
    lines.collect()
}

/// The file with a line behind the title that gives every parameter a value.
fn with_parameters(file: &str, parameters: &[String]) -> String {
    if parameters.is_empty() {
        return file.to_owned();
    }
    let given: String = parameters.iter().map(|p| format!(".param {p}=2\n")).collect();
    match file.split_once('\n') {
        Some((title, rest)) => format!("{title}\n{given}{rest}"),
        None => format!("{file}\n{given}"),
    }
}

/// The text in one of the encodings that are read, with one of the line ends.
fn encoded(text: &str, seed: &mut Seed) -> Vec<u8> {
    let text = match seed.below(6) {
        0 => text.replace("\r\n", "\n").replace('\n', "\r"),
        1 => text.replace("\r\n", "\n").replace('\n', "\r\n"),
        _ => text.to_owned(),
    };
    let units = text.encode_utf16();
    match seed.below(8) {
        0 => [0xEF, 0xBB, 0xBF].iter().chain(text.as_bytes()).copied().collect(),
        1 => [0xFF, 0xFE].into_iter().chain(units.flat_map(u16::to_le_bytes)).collect(),
        2 => [0xFE, 0xFF].into_iter().chain(units.flat_map(u16::to_be_bytes)).collect(),
        _ => text.into_bytes(),
    }
}

fn check(sentence: &Sentence, file: &str, seed: &mut Seed) -> Reading {
    let file = with_parameters(file, &sentence.parameters);
    let reading = read(&encoded(&file, seed));
    let told = complaints(&reading);
    assert!(told.is_empty(), "{told}\n{file:?}\n\n{file}");
    reading
}

fn maker(grammar: &Grammar, seed: u64) -> (Maker<'_>, Seed) {
    (Maker::new(grammar, seed), Seed(seed ^ 0xABCD))
}

#[test]
fn the_rules_that_count_as_unreadable_are_there() {
    for rule in UNREADABLE {
        assert!(rules::find(rule).is_some(), "{rule}");
    }
}

#[test]
fn every_element_and_dot_line_is_read() {
    let grammar = grammar();
    let (mut maker, mut seed) = maker(&grammar, 1);
    for number in 0..5000 {
        let is_element = number % 3 > 0;
        let sentence = maker.sentence(if is_element { "element" } else { "dot-line" });
        let reading = check(&sentence, &format!("\n{}", sentence.text), &mut seed);
        let elements = reading.circuit.elements.len();
        assert_eq!(elements, usize::from(is_element), "{:?}", sentence.text);
    }
}

#[test]
fn every_note_is_read() {
    let grammar = grammar();
    let (mut maker, mut seed) = maker(&grammar, 2);
    for _ in 0..2000 {
        let sentence = maker.sentence("note");
        let reading = check(&sentence, &format!("\n{}\n", sentence.text), &mut seed);
        assert_eq!(reading.circuit.notes.len(), 1, "{:?}", sentence.text);
    }
}

#[test]
fn every_number_and_expression_is_read() {
    let grammar = grammar();
    let (mut maker, mut seed) = maker(&grammar, 3);
    for _ in 0..1200 {
        let number = maker.sentence("number").text;
        assert!(syntax::number(number.as_bytes()).is_some(), "{number}");
        let sentence = maker.sentence("expression");
        assert!(syntax::expression(&sentence.text).is_ok(), "{:?}", sentence.text);
        check(&sentence, &format!("\nR1 a 0 {{{}}}", sentence.text), &mut seed);
    }
}

#[test]
fn every_statement_is_cut_into_tokens() {
    let grammar = grammar();
    let (mut maker, _) = maker(&grammar, 4);
    let mut tokens = Vec::new();
    for _ in 0..1500 {
        let text = maker.sentence("statement").text;
        let cut = syntax::tokens(&text, 0, u32::try_from(text.len()).unwrap(), &mut tokens);
        assert_eq!(cut, Ok(()), "{text:?}");
    }
}

#[test]
fn every_file_is_read_and_every_rule_is_tried() {
    let grammar = grammar();
    let (mut maker, mut seed) = maker(&grammar, 5);
    for _ in 0..1500 {
        let sentence = maker.sentence("netlist");
        check(&sentence, &sentence.text, &mut seed);
    }
    let untried: Vec<&String> =
        grammar.rules.keys().filter(|r| maker.uses.get(r.as_str()).is_none_or(|&n| n < 3)).collect();
    assert!(untried.iter().all(|r| matches!(r.as_str(), "statement" | "token" | "number")), "{untried:?}");
}

/// The names of the productions that the reader's functions say they read.
fn productions(folder: &Path) -> Vec<(String, String)> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let text = std::fs::read_to_string(&path).unwrap();
        for line in text.lines() {
            let name = line.trim().strip_prefix("/// `").and_then(|rest| rest.split_once(" = "));
            let Some((name, _)) = name else { continue };
            if name.chars().all(|c| c.is_ascii_lowercase() || c == '-') {
                found.push((name.to_owned(), path.display().to_string()));
            }
        }
    }
    found
}

#[test]
fn every_production_that_the_reader_names_is_in_the_grammar() {
    let grammar = grammar();
    let source = folder().parent().unwrap().join("src");
    let mut all = productions(&source.join("syntax"));
    all.extend(productions(&source.join("circuit")));
    assert!(all.len() > 50, "the reader's functions name their productions: {}", all.len());
    for (name, file) in all {
        // what begins with a letter that means nothing is kept, and told: it is no part of the language
        let known = grammar.rules.contains_key(&name) || name == "unknown-element";
        assert!(known, "{file} reads {name}, which no grammar has");
    }
}
