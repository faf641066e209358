//! `kneewise check`: all findings of all files.

use super::End;
use super::args::{Check, CheckFormat};
use super::baseline::Old;
use super::input::{Input, Job, wanted};
use super::output::Console;
use super::parallel;
use super::settings::{Found, Shelf};
use super::waiting::Waiting;
use kneewise::analysis::analyse;
use kneewise::config::{Monitor, Options};
use kneewise::report::{self, Summary};
use kneewise::review::Record;
use kneewise::text::{Disk, FileId, Loader, Span};
use std::collections::{BTreeMap, BTreeSet};
use std::path::PathBuf;
use std::sync::Arc;

/// Number of the root file in its own sources.
const ROOT: FileId = FileId(0);

pub fn run(console: &mut Console, command: &Check) -> Result<End, String> {
    let mut shelf = Shelf::new(&command.common.circuit)?;
    let wanted = wanted(&command.paths, &mut shelf);
    let mut failed = !wanted.problems.is_empty();
    for problem in &wanted.problems {
        console.say(problem);
    }
    let settings: Vec<Option<Arc<Found>>> = wanted.jobs.iter().map(|job| shelf.of(&job.path)).collect();
    let monitor = Monitor::default();
    let own = |found: &Option<Arc<Found>>| Options {
        swing: true,
        monitor: monitor.clone(),
        ..command.common.circuit.options(found.as_deref())
    };
    let options: Vec<Options> = settings.iter().map(own).collect();
    let mut old = match &command.against {
        Some(path) => Some(Old::read(path, &command.paths, &wanted.jobs, &options)?),
        None => None,
    };
    // one file shows how far it has come, of many it is how many are done
    let waiting = Waiting::new(&monitor, wanted.jobs.len() == 1);
    let outcomes = examine(console, command, &wanted.jobs, &options);
    drop(waiting);
    if monitor.is_cancelled() {
        console.say("ended by Ctrl-C");
        failed = true;
    }
    let mut sieve = Sieve { command, old: old.as_mut(), fails: false };
    let mut records = shelf.records();
    // what the settings say stands before what they are used for
    records.iter_mut().for_each(|record| sieve.settings(record));
    let included = included(&wanted.jobs, &outcomes);
    let mut told = Told::default();
    for (n, (job, outcome)) in wanted.jobs.iter().zip(outcomes).enumerate() {
        match outcome {
            Err(problem) => {
                console.say(&format!("{}: {problem}", job.path.display()));
                failed = true;
            }
            Ok(_) if included.contains(&n) => {}
            Ok(mut record) => {
                told.keep_new(&mut record);
                sieve.file(&mut record, job, settings[n].as_deref());
                records.push(record);
            }
        }
    }
    let fails = sieve.fails;
    failed |= !show(console, command, &records);
    Ok(End::of(!failed, fails))
}

/// Takes out of what was found what an older state has already, and sees whether the rest makes the run fail.
struct Sieve<'a> {
    command: &'a Check,
    old: Option<&'a mut Old>,
    fails: bool,
}

impl Sieve<'_> {
    fn file(&mut self, record: &mut Record, job: &Job, settings: Option<&Found>) {
        if let Some(old) = &mut self.old {
            old.sift(record, job);
        }
        self.judge(record, settings);
    }

    fn settings(&mut self, record: &mut Record) {
        if let Some(old) = &mut self.old {
            old.sift_settings(record);
        }
        self.judge(record, None);
    }

    fn judge(&mut self, record: &Record, settings: Option<&Found>) {
        let mut own = Summary::default();
        own.add(record);
        self.fails |= self.command.common.fails_on(settings, own.worst());
    }
}

/// Analyses all files at once.
fn examine(
    console: &mut Console,
    command: &Check,
    jobs: &[Job],
    options: &[Options],
) -> Vec<Result<Record, String>> {
    let numbers: Vec<usize> = (0..jobs.len()).collect();
    let with_states = command.format == CheckFormat::Sarif;
    // standard input can be read once only, so whoever wants it gets what was read here
    let standard = Input::standard(jobs);
    let work = |&n: &usize| {
        if options[n].monitor.is_cancelled() {
            return Err("not examined".to_owned());
        }
        let mut input = Input::with(standard.clone());
        let analysis = analyse(&mut input, &jobs[n].path, &options[n]);
        analysis.map(|a| Record::of(a, with_states)).map_err(|problem| problem.0)
    };
    parallel::map(&numbers, work, |done| console.progress(done, jobs.len()))
}

/// The files found in a directory that another one includes: they are checked there, and are no netlists of their own.
fn included(jobs: &[Job], outcomes: &[Result<Record, String>]) -> BTreeSet<usize> {
    let walked: BTreeMap<PathBuf, usize> = jobs
        .iter()
        .enumerate()
        .filter(|(_, job)| job.walked)
        .map(|(n, job)| (Disk.resolve(&job.path), n))
        .collect();
    let mut includes: Vec<BTreeSet<usize>> = vec![BTreeSet::new(); jobs.len()];
    for (n, record) in outcomes.iter().enumerate() {
        let Ok(record) = record else { continue };
        let names = record.sources.files().skip(1).map(|(_, file)| file.name.as_str());
        includes[n] = names
            .filter_map(|name| walked.get(&Disk.resolve(name.as_ref())).copied())
            .filter(|&m| m != n)
            .collect();
    }
    // of two that include each other the first stays
    let mut parts = BTreeSet::new();
    for (whole, list) in includes.iter().enumerate() {
        parts.extend(list.iter().filter(|&&n| !(n < whole && includes[n].contains(&whole))));
    }
    parts
}

/// What was told about included files: two netlists that share a file share its findings, told once.
#[derive(Default)]
struct Told(BTreeSet<(String, Span, &'static str, String)>);

impl Told {
    fn keep_new(&mut self, record: &mut Record) {
        let sources = &record.sources;
        record.findings.retain(|finding| {
            let at = finding.span.file;
            let place = Span { file: ROOT, ..finding.span };
            at == ROOT
                || self.0.insert((sources.name(at).to_owned(), place, finding.rule, finding.message.clone()))
        });
    }
}

/// Writes everything in the format asked for; `false` where it could not be written.
fn show(console: &mut Console, command: &Check, records: &[Record]) -> bool {
    let mut summary = Summary::default();
    records.iter().for_each(|record| summary.add(record));
    let document = match command.format {
        CheckFormat::Text => return text(console, command, records, summary),
        CheckFormat::Markdown => Ok(report::markdown::findings(records, summary)),
        CheckFormat::Json => report::json::findings(records, summary),
        CheckFormat::Sarif => report::sarif::findings(records, command.against.is_some()),
    };
    match document {
        Ok(text) => console.result(&text),
        Err(problem) => {
            console.say(&format!("the findings could not be written: {problem}"));
            false
        }
    }
}

fn text(console: &mut Console, command: &Check, records: &[Record], summary: Summary) -> bool {
    for record in records {
        let mut page = console.page();
        report::findings(&mut page, &record.sources, &record.findings);
        if command.accepted {
            report::accepted(&mut page, &record.sources, &record.findings);
        }
        report::skipped(&mut page, &record.skipped);
        if !console.result(page.text()) {
            return false;
        }
    }
    if records.is_empty() {
        return true;
    }
    let mut page = console.page();
    summary.write(&mut page);
    console.result(page.text())
}
