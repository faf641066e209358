//! `kneewise swing`: what moves over time and over the conditions.

use super::End;
use super::args::{Format, Swing};
use super::input::Input;
use super::output::Console;
use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::report;

/// A person who asks for the time pass has more patience than a check that runs it by the way.
const PATIENCE: u32 = 20;

pub fn run(console: &mut Console, command: &Swing) -> End {
    let options = Options { swing: true, patience: PATIENCE, ..command.common.options(None) };
    let analysis = match analyse(&mut Input::default(), &command.file, &options) {
        Ok(analysis) => analysis,
        Err(problem) => {
            console.say(&format!("{}: {}", command.file.display(), problem.0));
            return End::Failed;
        }
    };
    let written = match command.common.format {
        Format::Text => true,
        Format::Json => match report::json::swing(&analysis) {
            Ok(text) => console.result(&text),
            Err(problem) => {
                console.say(&format!("the swings could not be written as JSON: {problem}"));
                false
            }
        },
    };
    if std::env::var_os("KNEEWISE_EFFORT").is_some() {
        console.say(&format!("{:?}", analysis.swing.as_ref().map(|s| s.effort)));
    }
    if written { End::Clean } else { End::Failed }
}
