//! `kneewise.findings`: all findings of a run.

use super::place::Place;
use crate::finding::{Edit, Finding, Fix, Label, TrailStep};
use crate::report::Summary;
use crate::review::Record;
use crate::text::{FileId, Sources};
use serde::Serialize;

#[derive(Serialize)]
struct Document<'a> {
    format: &'static str,
    version: u32,
    findings: Vec<Entry<'a>>,
    skipped: Vec<Skip<'a>>,
    summary: Summary,
}

#[derive(Serialize)]
pub(super) struct Entry<'a> {
    rule: &'a str,
    severity: &'static str,
    #[serde(flatten)]
    place: Place<'a>,
    message: &'a str,
    subjects: &'a [String],
    labels: Vec<Worded<'a>>,
    trail: Vec<Step<'a>>,
    help: &'a str,
    fix: Option<Mend<'a>>,
    accepted: Option<&'a str>,
}

#[derive(Serialize)]
struct Worded<'a> {
    #[serde(flatten)]
    place: Place<'a>,
    message: &'a str,
}

#[derive(Serialize)]
struct Step<'a> {
    #[serde(flatten)]
    place: Place<'a>,
    what: &'a str,
}

#[derive(Serialize)]
struct Mend<'a> {
    title: &'a str,
    edits: Vec<Replacement<'a>>,
}

#[derive(Serialize)]
struct Replacement<'a> {
    #[serde(flatten)]
    place: Place<'a>,
    replacement: &'a str,
}

#[derive(Serialize)]
struct Skip<'a> {
    rule: &'a str,
    file: &'a str,
    reason: &'a str,
}

/// The findings of several root files as one document.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
pub fn findings(records: &[Record], summary: Summary) -> serde_json::Result<String> {
    let entries = records.iter().flat_map(|a| a.findings.iter().map(|f| entry(&a.sources, f)));
    let skipped = records.iter().flat_map(|a| {
        let file = a.sources.name(FileId(0));
        a.skipped.iter().map(move |s| Skip { rule: s.rule, file, reason: &s.reason })
    });
    super::line(&Document {
        format: "kneewise.findings",
        version: 1,
        findings: entries.collect(),
        skipped: skipped.collect(),
        summary,
    })
}

pub(super) fn entry<'a>(sources: &'a Sources, finding: &'a Finding) -> Entry<'a> {
    let worded = |label: &'a Label| Worded { place: Place::of(sources, label.span), message: &label.message };
    let step = |step: &'a TrailStep| Step { place: Place::of(sources, step.span), what: &step.what };
    // the words at the main place come first, as a label of their own
    let main = Worded { place: Place::of(sources, finding.span), message: &finding.label };
    let main = (!finding.label.is_empty()).then_some(main);
    Entry {
        rule: finding.rule,
        severity: finding.severity.word(),
        place: Place::of(sources, finding.span),
        message: &finding.message,
        subjects: &finding.subjects,
        labels: main.into_iter().chain(finding.labels.iter().map(worded)).collect(),
        trail: finding.trail.iter().map(step).collect(),
        help: &finding.help,
        fix: finding.fix.as_ref().map(|fix| mend(sources, fix)),
        accepted: finding.accepted.as_deref(),
    }
}

fn mend<'a>(sources: &'a Sources, fix: &'a Fix) -> Mend<'a> {
    let replacement =
        |edit: &'a Edit| Replacement { place: Place::of(sources, edit.span), replacement: &edit.replacement };
    Mend { title: &fix.title, edits: fix.edits.iter().map(replacement).collect() }
}
