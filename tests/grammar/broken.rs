//! Every broken input gives the findings that it announces, at their lines, and no others: no mistake is missed, and
//! none brings a flood of others behind it. How they announce: `grammar/README.md`.

use crate::files::folder;
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::finding::Severity;
use kneewise::rules::{self, Group};
use kneewise::text::Memory;
use std::collections::BTreeSet;
use std::fmt::Write as _;
use std::path::{Path, PathBuf};

/// Files below `dir` with this ending, sorted.
fn files(dir: &Path, ending: &str) -> Vec<PathBuf> {
    let mut files: Vec<PathBuf> = std::fs::read_dir(dir).unwrap().map(|e| e.unwrap().path()).collect();
    files.retain(|p| p.extension().is_some_and(|e| e == ending));
    files.sort();
    files
}

/// `finding RULE LINE` for each line that announces one.
fn announced(text: &str) -> Vec<String> {
    let one = |line: &str| {
        let (kind, rest) = line.trim().strip_prefix("* expect-")?.split_once(':')?;
        Some(format!("{kind} {}", rest.split_whitespace().collect::<Vec<_>>().join(" ")))
    };
    let mut all: Vec<String> = text.lines().filter_map(one).collect();
    all.sort();
    all
}

fn found(analysis: &Analysis) -> Vec<String> {
    let one = |finding: &kneewise::finding::Finding| {
        let kind = if finding.severity == Severity::Note { "note" } else { "finding" };
        let line = analysis.sources.positions(finding.span).0.line;
        let file = if finding.span.file.0 == 0 { "" } else { analysis.sources.name(finding.span.file) };
        format!("{kind} {} {line} {file}", finding.rule).trim().to_owned()
    };
    let mut all: Vec<String> = analysis.findings.iter().filter(|f| f.accepted.is_none()).map(one).collect();
    all.sort();
    all
}

fn check(files: &mut Memory, root: &str) -> Analysis {
    let options = Options { states: true, ..Options::default() };
    analyse(files, Path::new(root), &options).unwrap()
}

fn parts(folder: &Path) -> Memory {
    let mut memory = Memory::default();
    for part in files(&folder.join("parts"), "inc") {
        let name = format!("broken/parts/{}", part.file_name().unwrap().to_str().unwrap());
        memory.insert(name, std::fs::read(part).unwrap());
    }
    memory
}

#[test]
fn broken_inputs_give_exactly_what_they_announce() {
    let folder = folder().join("broken");
    let inputs = files(&folder, "net");
    assert!(inputs.len() >= 60, "{} broken inputs", inputs.len());
    let mut report = String::new();
    for path in inputs {
        let name = format!("broken/{}", path.file_name().unwrap().to_str().unwrap());
        let bytes = std::fs::read(&path).unwrap();
        let beside = std::fs::read_to_string(path.with_extension("expect"));
        let expected = announced(&beside.unwrap_or_else(|_| String::from_utf8_lossy(&bytes).into_owned()));
        let mut memory = parts(&folder);
        memory.insert(name.as_str(), bytes);
        let analysis = check(&mut memory, &name);
        let found = found(&analysis);
        if expected.is_empty() || expected != found {
            writeln!(report, "{name}\n  announced {expected:?}\n  found     {found:?}").unwrap();
            for finding in &analysis.findings {
                writeln!(report, "    {}: {}", finding.rule, finding.message).unwrap();
            }
        }
    }
    assert!(report.is_empty(), "\n{report}");
}

/// Every rule of reading has a broken input (or one of the large ones below) that shows it.
#[test]
fn every_reading_rule_has_a_broken_input() {
    let mut shown = BTreeSet::new();
    for path in ["net", "expect"].iter().flat_map(|ending| files(&folder().join("broken"), ending)) {
        for line in announced(&String::from_utf8_lossy(&std::fs::read(path).unwrap())) {
            shown.extend(line.split(' ').nth(1).map(str::to_owned));
        }
    }
    let missing: Vec<&str> = rules::all()
        .iter()
        .filter(|rule| matches!(rule.group, Group::Reading | Group::Notes) && !shown.contains(rule.name))
        .map(|rule| rule.name)
        .collect();
    assert!(missing.is_empty(), "{missing:?}");
}

fn told_rules(files: &mut Memory, root: &str) -> Vec<&'static str> {
    let analysis = check(files, root);
    analysis.findings.iter().filter(|f| f.severity > Severity::Note).map(|f| f.rule).collect()
}

const DIVIDER: &str = "V1 in 0 5\nR1 in out 1k\nR2 out 0 1k\n";

#[test]
fn a_statement_beyond_a_mebibyte_is_told_and_the_rest_is_read() {
    let long = format!("t\n{DIVIDER}R3 out 0 1k ; {}\n", "x".repeat(1 << 20));
    assert_eq!(told_rules(&mut Memory::with("a.net", long), "a.net"), ["limit-reached"]);
    let continued = format!("t\n{DIVIDER}R3 out 0 1k\n{}", "+ a=1\n".repeat(200_000));
    assert_eq!(told_rules(&mut Memory::with("a.net", continued), "a.net"), ["limit-reached"]);
    let cut_inside_a_character = format!("t\n{DIVIDER}{}{}\n", "R", "Ω".repeat(1 << 20));
    assert_eq!(told_rules(&mut Memory::with("a.net", cut_inside_a_character), "a.net"), ["limit-reached"]);
}

#[test]
fn files_within_files_are_bounded() {
    let mut memory = Memory::with("a.net", format!("t\n{DIVIDER}.include 0.inc\n"));
    for n in 0..40 {
        memory.insert(format!("{n}.inc"), format!(".include {}.inc\n", n + 1));
    }
    assert_eq!(told_rules(&mut memory, "a.net"), ["limit-reached"]);
}

#[test]
fn a_flood_of_one_finding_is_counted() {
    let lines: String = (0..3000).map(|n| format!("R{n} out\n")).collect();
    let told = told_rules(&mut Memory::with("a.net", format!("t\n{DIVIDER}{lines}")), "a.net");
    assert_eq!(told.iter().filter(|r| **r == "unreadable-line").count(), 1000);
}
