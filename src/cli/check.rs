//! `kneewise check`: all findings of all files.

use super::End;
use super::args::{Check, Format};
use super::input::{Input, wanted};
use super::output::Console;
use super::waiting::Waiting;
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::report::{self, Summary};
use kneewise::text::{FileId, Span};
use std::collections::BTreeSet;

/// Number of the root file in its own sources.
const ROOT: FileId = FileId(0);

pub fn run(console: &mut Console, command: &Check) -> End {
    let wanted = wanted(&command.paths);
    let mut failed = !wanted.problems.is_empty();
    for problem in &wanted.problems {
        console.say(problem);
    }
    let options = Options { swing: true, ..command.common.options(None) };
    let waiting = Waiting::new(&options.monitor);
    let (mut input, mut summary, mut kept) = (Input::default(), Summary::default(), Vec::new());
    let mut told = Told::default();
    for (n, file) in wanted.files.iter().enumerate() {
        if options.monitor.is_cancelled() {
            break;
        }
        console.progress(n, wanted.files.len());
        match analyse(&mut input, file, &options) {
            Err(problem) => {
                console.say(&format!("{}: {}", file.display(), problem.0));
                failed = true;
            }
            Ok(mut analysis) => {
                told.keep_new(&mut analysis);
                summary.add(&analysis);
                match command.common.format {
                    Format::Text => failed |= !console.result(&text(console, &analysis)),
                    Format::Json => kept.push(analysis),
                }
            }
        }
    }
    drop(waiting);
    if options.monitor.is_cancelled() {
        console.say("ended by Ctrl-C");
        failed = true;
    }
    failed |= !finish(console, command.common.format, &kept, summary);
    match failed {
        true => End::Failed,
        false if command.common.fail_on.reached_by(summary.worst()) => End::Found,
        false => End::Clean,
    }
}

/// What was told about included files: two netlists that share a file share its findings, told once.
#[derive(Default)]
struct Told(BTreeSet<(String, Span, &'static str, String)>);

impl Told {
    fn keep_new(&mut self, analysis: &mut Analysis) {
        let sources = &analysis.sources;
        analysis.findings.retain(|finding| {
            let at = finding.span.file;
            let place = Span { file: ROOT, ..finding.span };
            at == ROOT
                || self.0.insert((sources.name(at).to_owned(), place, finding.rule, finding.message.clone()))
        });
    }
}

/// The findings of one file.
fn text(console: &Console, analysis: &Analysis) -> String {
    let mut page = console.page();
    report::findings(&mut page, &analysis.sources, &analysis.findings);
    report::skipped(&mut page, &analysis.skipped);
    page.text().to_owned()
}

/// What stands at the end: the counts, or the whole document.
fn finish(console: &mut Console, format: Format, kept: &[Analysis], summary: Summary) -> bool {
    match format {
        Format::Text if summary.files == 0 => true,
        Format::Text => {
            let mut page = console.page();
            summary.write(&mut page);
            console.result(page.text())
        }
        Format::Json => match report::json::findings(kept, summary) {
            Ok(text) => console.result(&text),
            Err(problem) => {
                console.say(&format!("the findings could not be written as JSON: {problem}"));
                false
            }
        },
    }
}
