//! Runs `check` over every mutant in this process, and holds the result against the targets.

use super::judge::{Clean, Judgement};
use super::mutate::{Mutant, ORIENTATION, VALUE, WIRING, mutants};
use super::table::{Outcome, Row, noted_share, row, table};
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::finding::{Finding, Severity};
use kneewise::text::Memory;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

/// Mutants of one operator in an ordinary run.
const SAMPLE: usize = 12;

fn folder(which: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/faults").join(which)
}

/// Name and text of every netlist of a folder, in order.
fn netlists(which: &str) -> Vec<(String, String)> {
    let mut paths: Vec<PathBuf> = std::fs::read_dir(folder(which))
        .expect("the folder is there")
        .map(|e| e.expect("read").path())
        .collect();
    paths.retain(|p| p.extension().is_some_and(|e| e == "net"));
    paths.sort();
    let name = |p: &PathBuf| p.file_stem().expect("named").to_string_lossy().into_owned();
    paths.iter().map(|p| (name(p), std::fs::read_to_string(p).expect("text"))).collect()
}

fn check(text: &str) -> Analysis {
    let mut files = Memory::with("buoy.net", text.as_bytes());
    let options = Options { states: true, ..Options::default() };
    analyse(&mut files, Path::new("buoy.net"), &options).expect("the netlist is in memory")
}

/// With the time pass, as the program does it.
fn check_over_time(text: &str) -> Analysis {
    let mut files = Memory::with("buoy.net", text.as_bytes());
    let options = Options { states: true, swing: true, ..Options::default() };
    analyse(&mut files, Path::new("buoy.net"), &options).expect("the netlist is in memory")
}

fn serious(analysis: &Analysis) -> impl Iterator<Item = &Finding> {
    analysis.findings.iter().filter(|f| f.severity > Severity::Note && f.accepted.is_none())
}

/// A finding of warning or error on the changed element or its nodes; the clean files have none at all. What a changed
/// value does shows where a note expects something, so in that group a finding that a note gives counts wherever it is.
fn is_caught(analysis: &Analysis, mutant: &Mutant) -> bool {
    serious(analysis).any(|finding| {
        let by_note = ["broken-expectation", "over-rating"].contains(&finding.rule);
        if by_note && VALUE.contains(&mutant.operator) {
            return true;
        }
        // what lies inside an instance is a part of it
        let names =
            |s: &String| s.to_lowercase().split(':').any(|part| mutant.names.iter().any(|n| n == part));
        mutant.names.is_empty() || finding.subjects.iter().any(names)
    })
}

fn is_noted(text: &str) -> bool {
    text.lines()
        .filter_map(|l| l.strip_prefix("*@ "))
        .any(|n| ["expect", "range", "watch", "rating"].iter().any(|w| n.starts_with(w)))
}

/// Every `step`-th mutant of each operator, told apart by its place in the list of all.
fn sample(all: Vec<(usize, Mutant)>, most: Option<usize>) -> Vec<(usize, Mutant)> {
    let Some(most) = most else { return all };
    let mut by_operator: BTreeMap<&str, Vec<(usize, Mutant)>> = BTreeMap::new();
    for one in all {
        by_operator.entry(one.1.operator).or_default().push(one);
    }
    let pick = |list: Vec<(usize, Mutant)>| {
        let step = list.len().div_ceil(most).max(1);
        list.into_iter().step_by(step).collect::<Vec<_>>()
    };
    by_operator.into_values().flat_map(pick).collect()
}

/// Makes, checks and judges the mutants of a folder.
fn measure(which: &str, most: Option<usize>) -> (Vec<Outcome>, Vec<String>) {
    let files = netlists(which);
    let every =
        files.iter().enumerate().flat_map(|(n, (_, text))| mutants(text).into_iter().map(move |m| (n, m)));
    let chosen = sample(every.collect(), most);
    let mut clean: BTreeMap<usize, Clean> = BTreeMap::new();
    let (mut outcomes, mut missed) = (Vec::new(), Vec::new());
    for (n, mutant) in chosen {
        let (name, text) = &files[n];
        let mut caught = is_caught(&check(&mutant.text), &mutant);
        // what was caught in a sample need not be judged: it could only make the share better
        let judgement = if caught && most.is_some() {
            Judgement::Mistake
        } else {
            clean.entry(n).or_insert_with(|| Clean::of(text)).judge(&mutant.text)
        };
        // the time pass costs more than all else, so only what the rest misses is followed over time
        caught |= judgement == Judgement::Mistake && is_caught(&check_over_time(&mutant.text), &mutant);
        if !caught && judgement == Judgement::Mistake {
            missed.push(format!("{}: {name}: {}", mutant.operator, mutant.what));
        }
        if !caught && judgement == Judgement::Intent && std::env::var_os("KNEEWISE_INTENT").is_some() {
            missed.push(format!("(intent) {}: {name}: {}", mutant.operator, mutant.what));
        }
        outcomes.push(Outcome { operator: mutant.operator, judgement, caught, noted: is_noted(text) });
    }
    missed.sort();
    (outcomes, missed)
}

#[test]
fn no_clean_netlist_gives_a_warning() {
    let mut told = String::new();
    // the further ones are followed over time by the continuous integration, with a program that is compiled for speed
    for (which, over_time) in [("clean", true), ("held-out", true), ("further", false), ("unseen", false)] {
        for (name, text) in netlists(which) {
            let analysis = if over_time { check_over_time(&text) } else { check(&text) };
            for finding in serious(&analysis) {
                told.push_str(&format!("{which}/{name}: {} {}\n", finding.rule, finding.message));
            }
        }
    }
    assert!(told.is_empty(), "\n{told}");
}

#[test]
fn there_are_enough_clean_netlists_and_a_third_carry_notes() {
    let files = netlists("clean");
    let noted = files.iter().filter(|(_, text)| is_noted(text)).count();
    assert!(files.len() >= 40 && 3 * noted >= files.len(), "{noted} of {} carry notes", files.len());
}

#[test]
fn seeded_faults_are_caught() {
    let wanted = std::env::var("KNEEWISE_FAULTS").unwrap_or_default();
    let (which, most) = match wanted.as_str() {
        "" => ("clean", Some(SAMPLE)),
        "all" => ("clean", None),
        folder => (folder, None),
    };
    let (outcomes, missed) = measure(which, most);
    eprintln!("{}", table(&outcomes));
    if std::env::var_os("KNEEWISE_MISSED").is_some() {
        eprintln!("{}", missed.join("\n"));
    }
    if most.is_none() {
        assert_targets(&outcomes, &missed);
    } else {
        // a dozen of one operator say little; all of a group together say enough
        for (operators, target) in [(&WIRING[..], 0.95), (&ORIENTATION[..], 0.85)] {
            let pooled = Row::of(outcomes.iter().filter(|o| operators.contains(&o.operator)));
            let enough = pooled.mistakes() >= 4 * operators.len();
            assert!(enough && pooled.share() >= target, "{pooled:?}\n{}", missed.join("\n"));
        }
    }
}

fn assert_targets(outcomes: &[Outcome], missed: &[String]) {
    let below = |operators: &[&'static str], target: f64| {
        let low = operators.iter().filter(|o| row(outcomes, o).share() < target);
        low.map(|o| format!("{o}: {:.3} of {target}", row(outcomes, o).share())).collect::<Vec<_>>()
    };
    let mut wrong = below(&WIRING, 0.95);
    wrong.extend(below(&ORIENTATION, 0.85));
    let (caught, all) = noted_share(outcomes, false);
    if (caught as f64) < 0.85 * all as f64 {
        wrong.push(format!("notes: {caught} of {all}"));
    }
    assert!(wrong.is_empty(), "{}\n{}", wrong.join("\n"), missed.join("\n"));
}

/// The states of the clean netlists at rest, against the exact enumeration.
#[test]
fn states_of_the_clean_netlists_agree_with_the_enumeration() {
    use super::states::{at_rest, conditions};
    let mut compared = 0;
    let mut wrong = String::new();
    for which in ["clean", "held-out"] {
        for (name, text) in netlists(which) {
            let flat = super::netlist::Flat::read(&text, &[]);
            let transistors = flat.parts.iter().any(|p| "QMJ".contains(p.letter));
            let nominal = conditions(&flat, false).into_iter().next().unwrap_or_default();
            let Some(expected) = at_rest(&flat, &nominal).filter(|_| !transistors) else { continue };
            let analysis = check(&text);
            let solution = &analysis.operating.as_ref().expect("asked for").cases[0].solutions;
            for diode in solution.iter().flat_map(|s| &s.diodes) {
                let full = analysis.circuit.element_name(diode.element);
                let found = format!("{:?}", diode.state);
                let should: Vec<String> = expected
                    .get(&full.to_lowercase())
                    .into_iter()
                    .flatten()
                    .map(|s| format!("{s:?}"))
                    .collect();
                compared += 1;
                // an open split is told as what it may be
                if !should.contains(&found) && diode.state != kneewise::circuit::State::Open {
                    wrong.push_str(&format!("{which}/{name}: {full} is {found}, not {should:?}\n"));
                }
            }
        }
    }
    assert!(wrong.is_empty() && compared > 150, "{compared} compared\n{wrong}");
}
