//! `kneewise compare`: what a change does electrically, on two files, two directories, or as version control calls an
//! external comparison.

use super::End;
use super::args::{Compare, CompareFormat, is_called};
use super::input::{Input, is_standard_input, wanted};
use super::output::Console;
use super::settings::{Found, Shelf};
use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::finding::Severity;
use kneewise::operating::Verdict;
use kneewise::report::{self, Compared, Fate, Summary};
use kneewise::review::{self, Record, Revision};
use kneewise::text::{Disk, Loader};
use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Where the two states of one file lie. A side that is not there is `None`.
struct Twin {
    /// The file as the user knows it.
    name: PathBuf,
    old: Option<PathBuf>,
    new: Option<PathBuf>,
    /// Both lie elsewhere for the moment, but belong at `name`: what they include is looked up from there.
    is_borrowed: bool,
    /// Found in a directory, rather than named.
    walked: bool,
}

pub fn run(console: &mut Console, command: &Compare) -> Result<End, String> {
    match compare(console, command) {
        // version control takes a failure for a crash, and shows no other file
        Err(problem) if command.new.is_none() && is_called() => {
            console.say(&problem);
            Ok(End::Clean)
        }
        done => done,
    }
}

fn compare(console: &mut Console, command: &Compare) -> Result<End, String> {
    let mut shelf = Shelf::new(&command.common.circuit)?;
    let (twins, is_called) = twins(&command.paths(), &mut shelf)?;
    let (mut files, mut share, mut found) = (Vec::new(), 0.0, None);
    let mut parts: BTreeSet<PathBuf> = BTreeSet::new();
    for (n, twin) in twins.iter().enumerate() {
        console.progress(n, twins.len());
        found = shelf.of(&twin.name).or_else(|| twin.new.as_ref().and_then(|new| shelf.of(new)));
        let mut options = Options { swing: true, ..command.common.circuit.options(found.as_deref()) };
        if let Some(moved) = command.moved {
            options.thresholds.moved = moved;
        }
        share = options.thresholds.moved;
        let compared = one(twin, &options)?;
        included(&compared, &mut parts);
        files.push((twin, compared));
    }
    // what another file includes was compared there
    files.retain(|(twin, _)| !twin.walked || !twin.sides().any(|side| parts.contains(&Disk.resolve(side))));
    let files: Vec<Compared> = files.into_iter().map(|(_, compared)| compared).collect();
    let written = show(console, command.format, &files, share);
    Ok(match (written, is_called) {
        (false, _) => End::Failed,
        // version control takes any other answer for a crash
        (true, true) => End::Clean,
        (true, false) if fails(command, found, &files) => End::Found,
        (true, false) => End::Clean,
    })
}

fn fails(command: &Compare, found: Option<Arc<Found>>, files: &[Compared]) -> bool {
    let worst = files.iter().filter_map(worst).max();
    command.common.fails_on(found.as_deref(), worst)
}

impl Twin {
    fn sides(&self) -> impl Iterator<Item = &PathBuf> {
        self.old.iter().chain(&self.new)
    }
}

/// The files to compare, and whether version control asks.
fn twins(paths: &[PathBuf], shelf: &mut Shelf) -> Result<(Vec<Twin>, bool), String> {
    match paths {
        [old, new] if old.is_dir() && new.is_dir() => Ok((in_directories(old, new, shelf)?, false)),
        [old, new] if old.is_dir() || new.is_dir() => {
            Err("compare two files or two directories, not one of each".into())
        }
        [old, new] if is_standard_input(old) && is_standard_input(new) => {
            Err("standard input can be one side of a comparison, not both".into())
        }
        [old, new] => {
            let (old, new) = (Some(old.clone()), Some(new.clone()));
            let name = new.clone().unwrap_or_default();
            Ok((vec![Twin { name, old, new, is_borrowed: false, walked: false }], false))
        }
        // path old-file old-hex old-mode new-file new-hex new-mode [new-path what]
        [path, old, _, _, new, _, _, rest @ ..] if rest.is_empty() || rest.len() == 2 => {
            let there = |file: &PathBuf| (file != Path::new("/dev/null")).then(|| file.clone());
            let name = rest.first().unwrap_or(path).clone();
            let twin = Twin { name, old: there(old), new: there(new), is_borrowed: true, walked: false };
            Ok((vec![twin], true))
        }
        // version control names a file alone while its merge is not settled
        [path] if is_called() => {
            Err(format!("{}: its merge is not settled, so there is no one new state", path.display()))
        }
        [path] => Err(format!("{}: compare takes two: OLD and NEW", path.display())),
        _ => Err("compare takes two files or two directories: OLD and NEW".into()),
    }
}

/// Files of one path below each directory.
fn in_directories(old: &Path, new: &Path, shelf: &mut Shelf) -> Result<Vec<Twin>, String> {
    let mut names: BTreeSet<PathBuf> = BTreeSet::new();
    for side in [old, new] {
        let found = wanted(&[side.to_path_buf()], shelf);
        // a side without netlists is no mistake here: they may all be new, or gone
        names.extend(
            found.jobs.iter().filter_map(|job| job.path.strip_prefix(side).ok().map(Path::to_path_buf)),
        );
    }
    if names.is_empty() {
        return Err(format!("{} and {}: no netlist in these directories", old.display(), new.display()));
    }
    let there = |path: PathBuf| path.is_file().then_some(path);
    let twin = |name: &PathBuf| Twin {
        name: new.join(name),
        old: there(old.join(name)),
        new: there(new.join(name)),
        is_borrowed: false,
        walked: true,
    };
    Ok(names.iter().map(twin).collect())
}

fn one(twin: &Twin, options: &Options) -> Result<Compared, String> {
    let file = twin.name.display().to_string();
    let (mut old_input, old) = side(twin, twin.old.as_deref())?;
    let (mut new_input, new) = side(twin, twin.new.as_deref())?;
    let fate = match (old, new) {
        (Some(old), Some(new)) => {
            let old = Revision { loader: &mut old_input, root: &old, options };
            let new = Revision { loader: &mut new_input, root: &new, options };
            Fate::Both(Box::new(review::compare(old, new).map_err(|problem| problem.0)?))
        }
        (None, Some(new)) => {
            let analysis = analyse(&mut new_input, &new, options)
                .map_err(|problem| format!("{}: {}", new.display(), problem.0))?;
            let mut record = Record::of(analysis, false);
            record.findings.retain(|f| f.accepted.is_none());
            Fate::New(Box::new(record))
        }
        (Some(_), None) | (None, None) => Fate::Gone,
    };
    let shares_parts = twin.is_borrowed && includes(&fate);
    Ok(Compared { file, fate, shares_parts })
}

/// Whether both sides are there, and one of them includes other files.
fn includes(fate: &Fate) -> bool {
    let Fate::Both(comparison) = fate else { return false };
    [&comparison.findings.new, &comparison.findings.gone].iter().any(|r| r.sources.files().count() > 1)
}

/// Where a side is read from, and under which name.
fn side(twin: &Twin, path: Option<&Path>) -> Result<(Input, Option<PathBuf>), String> {
    let mut input = Input::default();
    let Some(path) = path else { return Ok((input, None)) };
    if !twin.is_borrowed {
        return Ok((input, Some(path.to_path_buf())));
    }
    let bytes = input.load(path).map_err(|e| format!("{}: {}", path.display(), e.0))?;
    input.hold(&twin.name, bytes);
    Ok((input, Some(twin.name.clone())))
}

/// Collects the files that were included.
fn included(compared: &Compared, parts: &mut BTreeSet<PathBuf>) {
    let records: Vec<&Record> = match &compared.fate {
        Fate::Both(comparison) => vec![&comparison.findings.new, &comparison.findings.gone],
        Fate::New(record) => vec![record],
        Fate::Gone => Vec::new(),
    };
    for record in records {
        parts.extend(record.sources.files().skip(1).map(|(_, file)| Disk.resolve(file.name.as_ref())));
    }
}

/// A state that flips counts as a warning, a condition that has lost its answer as an error.
fn worst(compared: &Compared) -> Option<Severity> {
    let of = |record: &Record| {
        let mut summary = Summary::default();
        summary.count_all(&record.findings);
        summary.worst()
    };
    match &compared.fate {
        Fate::Gone => None,
        Fate::New(record) => of(record),
        Fate::Both(comparison) => {
            let is_lost = |verdict| matches!(verdict, Some(Verdict::None | Verdict::Unverified));
            let flips = (!comparison.states.is_empty()).then_some(Severity::Warning);
            let lost = comparison.verdicts.iter().any(|v| is_lost(v.new)).then_some(Severity::Error);
            of(&comparison.findings.new).max(flips).max(lost)
        }
    }
}

fn show(console: &mut Console, format: CompareFormat, files: &[Compared], share: f64) -> bool {
    match format {
        CompareFormat::Text => {
            let mut page = console.page();
            report::comparison(&mut page, files, share);
            console.result(page.text())
        }
        CompareFormat::Markdown => console.result(&report::comparison_markdown(files, share)),
        CompareFormat::Json => console.document("comparison", report::json::comparison(files)),
    }
}
