//! `kneewise annotate`: marks behind the diodes; shown, written, verified, or taken away.

use super::End;
use super::args::Annotate;
use super::input::Input;
use super::output::Console;
use super::settings::Shelf;
use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::report;
use kneewise::review::{self, Annotated, DiskDesk};
use kneewise::text::Loader;
use std::path::Path;

pub fn run(console: &mut Console, command: &Annotate) -> End {
    if command.files.len() > 1 && !(command.write || command.verify) {
        console.say("several files can only be written or verified: add --write or --verify");
        return End::Failed;
    }
    let mut shelf = match Shelf::new(command.circuit.config.as_deref()) {
        Ok(shelf) => shelf,
        Err(problem) => {
            console.say(&problem);
            return End::Failed;
        }
    };
    let mut worst = End::Clean;
    for file in &command.files {
        let end = match one(console, command, &mut shelf, file) {
            Ok(end) => end,
            Err(problem) => {
                console.say(&problem);
                End::Failed
            }
        };
        worst = match (worst, end) {
            (End::Failed, _) | (_, End::Failed) => End::Failed,
            (End::Found, _) | (_, End::Found) => End::Found,
            _ => End::Clean,
        };
    }
    worst
}

fn one(console: &mut Console, command: &Annotate, shelf: &mut Shelf, file: &Path) -> Result<End, String> {
    let with_name = |problem: &str| format!("{}: {problem}", file.display());
    let mut input = Input::default();
    let original = input.load(file).map_err(|e| with_name(&e.0))?;
    if command.strip {
        return finish(console, command, file, &original, &review::strip(&original));
    }
    // what is marked is what was read, even if the file changes meanwhile
    input.hold(file, original.clone());
    let found = shelf.of(file);
    // a part with a memory shows its states over time only
    let options = Options { swing: true, ..command.circuit.options(found.as_deref()) };
    let analysis = analyse(&mut input, file, &options).map_err(|e| with_name(&e.0))?;
    let annotated = review::annotate(&analysis, &original);
    for (included, count) in &annotated.elsewhere {
        let lines = if *count == 1 { "1 diode".into() } else { format!("{count} diodes") };
        console.say(&format!("{}: {lines} in {included}, which it includes, have no mark", file.display()));
    }
    if command.verify {
        return verify(console, file, &annotated);
    }
    finish(console, command, file, &original, &annotated.bytes)
}

fn verify(console: &mut Console, file: &Path, annotated: &Annotated) -> Result<End, String> {
    let mut page = console.page();
    report::marks(&mut page, &file.display().to_string(), annotated);
    let written = console.result(page.text());
    Ok(match (written, annotated.changes.is_empty()) {
        (false, _) => End::Failed,
        (true, true) => End::Clean,
        (true, false) => End::Found,
    })
}

/// Shows the file, or writes it.
fn finish(
    console: &mut Console,
    command: &Annotate,
    file: &Path,
    original: &[u8],
    bytes: &[u8],
) -> Result<End, String> {
    if !command.write {
        return Ok(if console.result_bytes(bytes) { End::Clean } else { End::Failed });
    }
    if file == Path::new("-") {
        return Err("standard input cannot be written in place; leave --write out".into());
    }
    review::save(&mut DiskDesk::default(), file, original, bytes).map_err(|problem| problem.0)?;
    Ok(End::Clean)
}
