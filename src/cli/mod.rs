//! Arguments, dispatch, exit code. The library is seen through its public interface only; what is said about
//! the run goes to standard error, results go to standard output.

mod annotate;
mod args;
mod baseline;
mod check;
mod compare;
mod extras;
mod input;
mod output;
mod parallel;
mod rules;
mod settings;
mod states;
mod swing;
mod waiting;

use args::{Args, Command};
use clap::Parser;
use output::Console;
use std::process::ExitCode;

/// How a run ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum End {
    /// Done, nothing at or above `--fail-on`.
    Clean,
    /// Done, something at or above it.
    Found,
    /// The job could not be done.
    Failed,
}

impl End {
    /// Of a run whose results were `written`, and that `fails` by what it found.
    fn of(written: bool, fails: bool) -> Self {
        match (written, fails) {
            (false, _) => End::Failed,
            (true, true) => End::Found,
            (true, false) => End::Clean,
        }
    }
}

/// Reads the arguments, does what they ask for, and gives the exit code.
pub fn run() -> ExitCode {
    let args = match Args::try_parse() {
        Ok(args) => args,
        Err(problem) => {
            // help and version come this way too; a closed pipe is no error
            let _ = problem.print();
            return ExitCode::from(u8::try_from(problem.exit_code()).unwrap_or(2));
        }
    };
    let mut console = Console::new(args.color);
    let done = match &args.command {
        Command::Check(command) => check::run(&mut console, command),
        Command::States(command) => states::run(&mut console, command),
        Command::Swing(command) => swing::run(&mut console, command),
        Command::Annotate(command) => annotate::run(&mut console, command),
        Command::Compare(command) => compare::run(&mut console, command),
        Command::Rules(command) => Ok(rules::run(&mut console, command)),
        Command::Completions { shell } => Ok(extras::completions(&mut console, *shell)),
        Command::Manual => Ok(extras::manual(&mut console)),
    };
    ExitCode::from(match console.told(done).unwrap_or(End::Failed) {
        End::Clean => 0,
        End::Found => 1,
        End::Failed => 2,
    })
}
