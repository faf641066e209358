//! `kneewise annotate`: marks behind the diodes of netlists and of what they include; shown, written, verified, or taken
//! away. All netlists of a run are examined first, since a file that several include gets one mark for all of them.

use super::End;
use super::args::Annotate;
use super::input::{Input, Job, is_standard_input, wanted};
use super::output::Console;
use super::settings::Shelf;
use kneewise::analysis::analyse;
use kneewise::circuit;
use kneewise::config::Options;
use kneewise::report;
use kneewise::review::{self, Annotated, DiskDesk, FileMarks, Role};
use kneewise::text::Loader;
use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

/// One netlist of the run, as far as it was read.
struct Circuit {
    job: Job,
    /// By resolved path; one circuit may include a file several times.
    files: Vec<(PathBuf, FileMarks)>,
    /// Outside of these an included file is not this project's to write.
    boundary: PathBuf,
}

/// One file of the run.
struct File<'c> {
    /// As the first circuit names it.
    name: &'c str,
    role: Role,
    seen: Vec<&'c FileMarks>,
}

pub fn run(console: &mut Console, command: &Annotate) -> Result<End, String> {
    let mut shelf = Shelf::new(&command.circuit)?;
    let jobs = jobs(console, command, &mut shelf)?;
    let mut input = Input::keeping();
    let mut worst = if jobs.is_empty() { End::Failed } else { End::Clean };
    let mut circuits = Vec::new();
    for (n, job) in jobs.iter().enumerate() {
        console.progress(n, jobs.len());
        match console.told(circuit(command, &mut shelf, &mut input, job)) {
            Some(circuit) => circuits.push(circuit),
            None => worst = End::Failed,
        }
    }
    let (files, alone) = files(&circuits);
    for (name, place, count) in alone {
        console.say(&left_alone(name, &place, count));
    }
    if !command.write && !command.verify {
        return Ok(show(console, command, &input, &circuits).max(worst));
    }
    for (path, file) in &files {
        let done = one(console, command, &input, path, file);
        worst = worst.max(console.told(done).unwrap_or(End::Failed));
    }
    Ok(worst)
}

/// The netlists that the arguments stand for.
fn jobs(console: &mut Console, command: &Annotate, shelf: &mut Shelf) -> Result<Vec<Job>, String> {
    let writes = command.write || command.verify;
    if !writes && command.files.iter().any(|file| !is_standard_input(file) && file.is_dir()) {
        return Err(match command.files.as_slice() {
            [only] => format!(
                "{}: it is a directory, which can only be written or verified: add --write or --verify",
                only.display()
            ),
            _ => several(),
        });
    }
    if !writes && command.files.len() > 1 {
        return Err(several());
    }
    if command.write && command.files.iter().any(|file| is_standard_input(file)) {
        return Err("standard input cannot be written in place; leave --write out".into());
    }
    let wanted = wanted(&command.files, shelf);
    for problem in &wanted.problems {
        console.say(problem);
    }
    Ok(wanted.jobs)
}

fn several() -> String {
    "several files can only be written or verified: add --write or --verify".into()
}

/// Examines one netlist; where marks are only taken away, just reads it.
fn circuit(command: &Annotate, shelf: &mut Shelf, input: &mut Input, job: &Job) -> Result<Circuit, String> {
    let with_name = |problem: &str| format!("{}: {problem}", job.path.display());
    let found = shelf.of(&job.path);
    // a part with a memory shows its states over time only
    let options = Options { swing: true, ..command.circuit.options(found.as_deref()) };
    let files = if command.strip {
        let reading = circuit::read(input, &job.path, &options).map_err(|e| with_name(&e.0))?;
        reading.sources.files().map(|(_, file)| FileMarks::none(file.name.clone())).collect()
    } else {
        let analysis = analyse(input, &job.path, &options).map_err(|e| with_name(&e.0))?;
        if let Some(finding) = analysis.not_set(&options) {
            return Err(with_name(&finding.message));
        }
        review::file_marks(&analysis)
    };
    let files = files.into_iter().map(|marks| (input.resolve(Path::new(&marks.name)), marks)).collect();
    Ok(Circuit { job: job.clone(), files, boundary: input.boundary(&job.path) })
}

/// An included file that is not written: its name, the netlist that includes it, how many diodes it has.
type Alone<'c> = (&'c str, PathBuf, usize);

/// The files of all circuits, each once, and those that lie outside of the project.
fn files<'c>(circuits: &'c [Circuit]) -> (BTreeMap<PathBuf, File<'c>>, Vec<Alone<'c>>) {
    let parts = parts(circuits);
    let mut files: BTreeMap<PathBuf, File<'c>> = BTreeMap::new();
    let mut alone = Vec::new();
    // roots first: a netlist that is also included keeps its title
    for (depth, role) in [(0, Role::Root), (1, Role::Part)] {
        for circuit in circuits {
            let is_part = circuit.files.first().is_some_and(|(path, _)| parts.contains(path));
            if circuit.job.walked && is_part {
                // it is marked as a part of the netlist that includes it
                continue;
            }
            let range = if depth == 0 { 0..circuit.files.len().min(1) } else { 1..circuit.files.len() };
            for (path, marks) in circuit.files.get(range).unwrap_or_default() {
                if role == Role::Part && !path.starts_with(&circuit.boundary) {
                    if marks.count() > 0 {
                        alone.push((marks.name.as_str(), circuit.job.path.clone(), marks.count()));
                    }
                    continue;
                }
                let fresh = File { name: &marks.name, role, seen: Vec::new() };
                files.entry(path.clone()).or_insert(fresh).seen.push(marks);
            }
        }
    }
    (files, alone)
}

/// Netlists found in a directory that another one includes; of two that include each other the first is none.
fn parts(circuits: &[Circuit]) -> BTreeSet<&PathBuf> {
    let includes = |whole: usize, path: &PathBuf| {
        circuits.get(whole).is_some_and(|c| c.files.iter().skip(1).any(|(other, _)| other == path))
    };
    let mut parts = BTreeSet::new();
    for (n, own) in circuits.iter().enumerate().filter_map(|(n, c)| Some((n, &c.files.first()?.0))) {
        let of = |m: &usize| *m != n && includes(*m, own);
        let back = |m: &usize| circuits[*m].files.first().is_some_and(|(path, _)| includes(n, path));
        if (0..circuits.len()).filter(of).any(|m| m < n || !back(&m)) {
            parts.insert(own);
        }
    }
    parts
}

fn left_alone(included: &str, root: &Path, count: usize) -> String {
    let (diodes, have) =
        if count == 1 { ("1 diode".into(), "has") } else { (format!("{count} diodes"), "have") };
    format!(
        "{}: {diodes} in {included}, which it includes from outside of its project, {have} no mark",
        root.display()
    )
}

/// Shows the one netlist, and says what of its diodes stands elsewhere.
fn show(console: &mut Console, command: &Annotate, input: &Input, circuits: &[Circuit]) -> End {
    let Some(circuit) = circuits.first() else { return End::Failed };
    let Some((path, marks)) = circuit.files.first() else { return End::Failed };
    let bytes = match (input.kept(path), command.strip) {
        (None, _) => return End::Failed,
        (Some(original), true) => review::strip(original),
        (Some(original), false) => review::annotate_file(original, Role::Root, &[marks]).bytes,
    };
    for (_, part) in circuit.files.iter().skip(1).filter(|(path, _)| path.starts_with(&circuit.boundary)) {
        let diodes = match part.count() {
            0 => continue,
            1 => "1 diode".to_owned(),
            count => format!("{count} diodes"),
        };
        console.say(&format!(
            "{}: {diodes} in {}, which it includes; --write marks that file too",
            circuit.job.path.display(),
            part.name
        ));
    }
    if console.result_bytes(&bytes) { End::Clean } else { End::Failed }
}

/// Verifies or writes one file.
fn one(
    console: &mut Console,
    command: &Annotate,
    input: &Input,
    path: &Path,
    file: &File<'_>,
) -> Result<End, String> {
    // what is marked is what was read, even if the file changes meanwhile
    let original = input.kept(path).ok_or_else(|| format!("{}: it could not be read", file.name))?;
    let bytes = match (command.strip, file.role) {
        (true, Role::Root) => review::strip(original),
        (true, Role::Part) => review::strip_part(original),
        (false, role) => {
            let annotated = review::annotate_file(original, role, &file.seen);
            if command.verify {
                return Ok(verify(console, file.name, &annotated));
            }
            annotated.bytes
        }
    };
    review::save(&mut DiskDesk::default(), Path::new(file.name), original, &bytes)
        .map_err(|problem| problem.0)?;
    Ok(End::Clean)
}

fn verify(console: &mut Console, name: &str, annotated: &Annotated) -> End {
    let mut page = console.page();
    report::marks(&mut page, name, annotated);
    let written = console.result(page.text());
    End::of(written, !annotated.changes.is_empty())
}
