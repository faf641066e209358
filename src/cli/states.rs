//! `kneewise states`: every diode's state, and on request the reasoning about one.

use super::End;
use super::args::{Common, Format, States};
use super::input::Input;
use super::output::Console;
use kneewise::analysis::{Analysis, analyse};
use kneewise::finding::Severity;
use kneewise::report::{self, Summary};
use std::path::Path;

pub fn run(console: &mut Console, command: &States) -> End {
    let options = command.common.options(command.why.as_deref());
    let analysis = match analyse(&mut Input::default(), &command.file, &options) {
        Ok(analysis) => analysis,
        Err(problem) => {
            console.say(&format!("{}: {}", command.file.display(), problem.0));
            return End::Failed;
        }
    };
    if let Some(name) = missing_diode(&analysis, command.why.as_deref()) {
        console.say(&format!("there is no diode `{name}` in {}", command.file.display()));
        return End::Failed;
    }
    let written = match command.common.format {
        Format::Text => {
            let mut page = console.page();
            match command.why {
                Some(_) => report::why(&mut page, &analysis),
                None => report::states(&mut page, &analysis),
            }
            console.result(page.text())
        }
        Format::Json => match report::json::states(&analysis) {
            Ok(text) => console.result(&text),
            Err(problem) => {
                console.say(&format!("the states could not be written as JSON: {problem}"));
                false
            }
        },
    };
    let worst = worst(console, &command.file, &command.common, &analysis);
    match written {
        false => End::Failed,
        true if command.common.fail_on.reached_by(worst) => End::Found,
        true => End::Clean,
    }
}

/// The name that `--why` asks about, where no diode has it.
fn missing_diode<'a>(analysis: &Analysis, why: Option<&'a str>) -> Option<&'a str> {
    let found = analysis.operating.as_ref().is_some_and(|o| o.why.is_some());
    why.filter(|_| !found)
}

/// The most serious of the findings and the verdicts; says on standard error that there are findings, since
/// this command does not show them.
pub fn worst(console: &mut Console, file: &Path, common: &Common, analysis: &Analysis) -> Option<Severity> {
    let mut summary = Summary::default();
    summary.add(analysis);
    if summary.errors + summary.warnings > 0 {
        let file = file.display();
        let drop = common.drop.iter().map(|volts| format!(" --drop {volts}"));
        let set = common.set.iter().map(|(name, value)| format!(" --set {name}={value}"));
        let options: String = drop.chain(set).collect();
        console
            .say(&format!("{file} has {}; `kneewise check {file}{options}` tells them", summary.troubles()));
    }
    let verdict = analysis.hopeless.then_some(Severity::Error);
    verdict.max(summary.worst())
}
