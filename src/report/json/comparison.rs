//! `kneewise.comparison`: what differs between two revisions.

use super::findings::{Entry, entry};
use super::number;
use crate::operating::{State, Verdict};
use crate::report::{Compared, Fate};
use crate::review::{Comparison, Move, Record, StateChange};
use serde::Serialize;

#[derive(Serialize, Default)]
struct Document<'a> {
    format: &'static str,
    version: u32,
    states: Vec<Flip<'a>>,
    currents: Vec<Moved<'a>>,
    voltages: Vec<Moved<'a>>,
    wiring: Vec<Wired<'a>>,
    findings: Findings<'a>,
    verdicts: Vec<Judged<'a>>,
    trust: Vec<Trusted<'a>>,
    files: Vec<FileEntry<'a>>,
}

#[derive(Serialize)]
struct Flip<'a> {
    diode: &'a str,
    case: &'a str,
    old: &'static str,
    new: &'static str,
    #[serde(rename = "old_current_A")]
    old_current: Option<f64>,
    #[serde(rename = "new_current_A")]
    new_current: Option<f64>,
    why: &'a str,
    file: &'a str,
}

#[derive(Serialize)]
struct Moved<'a> {
    name: &'a str,
    case: &'a str,
    old: Option<f64>,
    new: Option<f64>,
    file: &'a str,
}

#[derive(Serialize)]
struct Wired<'a> {
    element: &'a str,
    what: &'a str,
    file: &'a str,
}

#[derive(Serialize, Default)]
struct Findings<'a> {
    new: Vec<Entry<'a>>,
    gone: Vec<Entry<'a>>,
    kept: usize,
}

#[derive(Serialize)]
struct Judged<'a> {
    case: &'a str,
    old: Option<&'static str>,
    new: Option<&'static str>,
    file: &'a str,
}

#[derive(Serialize)]
struct Trusted<'a> {
    diode: &'a str,
    case: &'a str,
    old: &'static str,
    new: &'static str,
    file: &'a str,
}

#[derive(Serialize)]
struct FileEntry<'a> {
    file: &'a str,
    what: &'static str,
}

/// What differs in all files, as one document.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
pub fn comparison(files: &[Compared]) -> serde_json::Result<String> {
    let mut document = Document { format: "kneewise.comparison", version: 1, ..Document::default() };
    for compared in files {
        let file = compared.file.as_str();
        let what = match &compared.fate {
            Fate::Both(comparison) => {
                document.add(file, comparison);
                if comparison.is_empty() { "same" } else { "differs" }
            }
            Fate::New(record) => {
                document.findings.new.extend(entries(record));
                "new"
            }
            Fate::Gone => "gone",
        };
        document.files.push(FileEntry { file, what });
    }
    super::line(&document)
}

fn entries(record: &Record) -> impl Iterator<Item = Entry<'_>> {
    record.findings.iter().map(|f| entry(&record.sources, f))
}

fn flip<'a>(file: &'a str, change: &'a StateChange) -> Flip<'a> {
    let word = |state: Option<State>| state.map_or("several", State::word);
    Flip {
        diode: &change.diode,
        case: &change.case,
        old: word(change.old),
        new: word(change.new),
        old_current: change.old_current.and_then(number),
        new_current: change.new_current.and_then(number),
        why: &change.why,
        file,
    }
}

fn moved<'a>(file: &'a str, change: &'a Move) -> Moved<'a> {
    Moved { name: &change.name, case: &change.case, old: number(change.old), new: number(change.new), file }
}

impl<'a> Document<'a> {
    fn add(&mut self, file: &'a str, comparison: &'a Comparison) {
        self.states.extend(comparison.states.iter().map(|c| flip(file, c)));
        self.currents.extend(comparison.currents.iter().map(|m| moved(file, m)));
        self.voltages.extend(comparison.voltages.iter().map(|m| moved(file, m)));
        self.wiring.extend(comparison.wiring.iter().map(|w| Wired {
            element: &w.element,
            what: &w.what,
            file,
        }));
        self.findings.new.extend(entries(&comparison.findings.new));
        self.findings.gone.extend(entries(&comparison.findings.gone));
        self.findings.kept += comparison.findings.kept;
        self.verdicts.extend(comparison.verdicts.iter().map(|v| Judged {
            case: &v.case,
            old: v.old.map(Verdict::word),
            new: v.new.map(Verdict::word),
            file,
        }));
        self.trust.extend(comparison.trust.iter().map(|t| Trusted {
            diode: &t.diode,
            case: &t.case,
            old: t.old.word(),
            new: t.new.word(),
            file,
        }));
    }
}
