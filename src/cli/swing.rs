//! `kneewise swing`: what moves over time and over the conditions, as text, JSON and a picture.

use super::End;
use super::args::{Format, Swing};
use super::input::Input;
use super::output::Console;
use super::settings::Shelf;
use super::waiting::Waiting;
use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::report;
use kneewise::text::trouble;
use std::path::Path;

/// Whoever asks for the time pass has more patience than a check that runs it by the way.
const PATIENCE: u32 = 20;

pub fn run(console: &mut Console, command: &Swing) -> Result<End, String> {
    let mut shelf = Shelf::new(&command.common.circuit)?;
    let found = shelf.of(&command.file);
    let circuit = command.common.circuit.options(found.as_deref());
    let options = Options { swing: true, patience: PATIENCE, ..circuit };
    let waiting = Waiting::new(&options.monitor, true);
    let analysed = analyse(&mut Input::default(), &command.file, &options);
    drop(waiting);
    let analysis = analysed.map_err(|problem| format!("{}: {}", command.file.display(), problem.0))?;
    let mut written = match command.format {
        Format::Text => {
            let mut page = console.page();
            report::swing(&mut page, &analysis);
            console.result(page.text())
        }
        Format::Json => console.document("swings", report::json::swing(&analysis)),
    };
    if let Some(path) = &command.plot {
        written &= picture(console, &analysis, path);
    }
    if options.monitor.is_cancelled() {
        console.say("ended by Ctrl-C; what was not followed is named above");
        written = false;
    }
    let worst =
        super::states::worst(console, &command.file, &command.common.circuit, &analysis, shelf.findings());
    Ok(End::of(written, command.common.fails_on(found.as_deref(), worst)))
}

/// Writes the picture. `false` where it could not be written.
fn picture(console: &mut Console, analysis: &Analysis, path: &Path) -> bool {
    let is_svg = path.extension().is_some_and(|e| e.eq_ignore_ascii_case("svg"));
    let drawn = if is_svg { report::plot::svg(analysis) } else { report::plot::html(analysis) };
    let done =
        drawn.and_then(|text| std::fs::write(path, text).map_err(|problem| trouble::writing(&problem)));
    if let Err(problem) = &done {
        console.say(&format!("{}: the picture could not be written: {problem}", path.display()));
    }
    done.is_ok()
}
