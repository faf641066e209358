//! `kneewise states`: every diode's state, and on request the reasoning about one.

use super::End;
use super::args::{CircuitOptions, Format, States};
use super::input::Input;
use super::output::Console;
use super::settings::Shelf;
use kneewise::analysis::{Analysis, analyse};
use kneewise::circuit::Behaviour;
use kneewise::config::{Options, SecondOpinion};
use kneewise::finding::{Finding, Severity};
use kneewise::report::{self, Summary};
use kneewise::text::nearest;
use std::path::Path;

/// So many errors are told, since the states may hang on them; `check` tells all.
const ERRORS_SHOWN: usize = 3;

/// Diodes of one name in several instances that are listed.
const INSTANCES_SHOWN: usize = 4;

/// Names among which the one that was meant is looked for.
const MOST_CANDIDATES: usize = 2000;

pub fn run(console: &mut Console, command: &States) -> Result<End, String> {
    let mut shelf = Shelf::new(&command.common.circuit)?;
    let found = shelf.of(&command.file);
    let opinion = if command.second_opinion { SecondOpinion::Everywhere } else { SecondOpinion::Usual };
    let common = command.common.circuit.options(found.as_deref());
    let options = Options { why: command.why.clone(), opinion, ..common };
    let analysis = analyse(&mut Input::default(), &command.file, &options)
        .map_err(|problem| format!("{}: {}", command.file.display(), problem.0))?;
    if let Some(problem) = missing_diode(&analysis, command.why.as_deref(), &command.file) {
        return Err(problem);
    }
    let written = match command.format {
        Format::Text => {
            let mut page = console.page();
            match command.why {
                Some(_) => report::why(&mut page, &analysis),
                None => report::states(&mut page, &analysis),
            }
            console.result(page.text())
        }
        Format::Json => console.document("states", report::json::states(&analysis)),
    };
    let worst = worst(console, &command.file, &command.common.circuit, &analysis, shelf.findings());
    Ok(End::of(written, command.common.fails_on(found.as_deref(), worst)))
}

/// Why there is no reasoning about the diode that `--why` asks about, where none has that name.
fn missing_diode(analysis: &Analysis, why: Option<&str>, file: &Path) -> Option<String> {
    let found = analysis.operating.as_ref().is_some_and(|o| o.why.is_some());
    let name = why.filter(|_| !found)?;
    let circuit = &analysis.circuit;
    if circuit.elements().any(|(id, _)| circuit.element_name(id).eq_ignore_ascii_case(name)) {
        return Some(format!(
            "{name} in {} is no diode, and states are reasoned about for diodes only",
            file.display()
        ));
    }
    let is_diode = |behaviour: &Behaviour| matches!(behaviour, Behaviour::Diode { .. });
    let diodes = circuit.elements().filter(|(_, e)| is_diode(&e.behaviour)).take(MOST_CANDIDATES);
    let names: Vec<String> = diodes.map(|(id, _)| circuit.element_name(id)).collect();
    let inside = |full: &&String| full.rsplit(':').next().is_some_and(|last| last.eq_ignore_ascii_case(name));
    let inside: Vec<&str> = names.iter().filter(inside).map(String::as_str).collect();
    if let [_, ..] = inside.as_slice() {
        let known = inside.iter().take(INSTANCES_SHOWN).copied().collect::<Vec<_>>().join(", ");
        return Some(format!(
            "{name} in {} stands inside of instances; write its path, such as {known}",
            file.display()
        ));
    }
    let near = nearest(name, names.iter().map(String::as_str));
    let hint = near.map_or(String::new(), |near| format!("; did you mean `{near}`?"));
    Some(format!("there is no diode `{name}` in {}{hint}", file.display()))
}

/// The most serious of the findings and the verdicts; says on standard error that there are findings, since
/// this command does not show them.
pub fn worst<'f>(
    console: &mut Console,
    file: &Path,
    circuit: &CircuitOptions,
    analysis: &Analysis,
    of_settings: impl Iterator<Item = &'f Finding>,
) -> Option<Severity> {
    let mut summary = Summary::default();
    summary.count_all(&analysis.findings);
    of_settings.for_each(|f| summary.count_all(std::slice::from_ref(f)));
    let errors = analysis.findings.iter().filter(|f| f.severity == Severity::Error && f.accepted.is_none());
    for error in errors.take(ERRORS_SHOWN) {
        let (place, _) = analysis.sources.positions(error.span);
        let name = analysis.sources.name(error.span.file);
        console.say(&format!("{name}:{}:{}: {}", place.line, place.column, error.message));
    }
    if summary.errors + summary.warnings > 0 {
        let file = file.display();
        let drop = circuit.drop.iter().map(|volts| format!(" --drop {volts}"));
        let set = circuit.set.iter().map(|(name, value)| format!(" --set {name}={value}"));
        let options: String = drop.chain(set).collect();
        console
            .say(&format!("{file} has {}; `kneewise check {file}{options}` tells them", summary.troubles()));
    }
    let verdict = analysis.hopeless.then_some(Severity::Error);
    verdict.max(summary.worst())
}
