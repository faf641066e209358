//! The two streams of a run: results to standard output, everything about the run to standard error.

use clap::ColorChoice;
use kneewise::report::Page;
use kneewise::text::trouble;
use std::io::{self, IsTerminal, Write};
use std::time::{Duration, Instant};

/// Work longer than this shows how far it has come, on a terminal.
const PATIENCE: Duration = Duration::from_secs(1);

/// Standard output and standard error.
pub struct Console {
    colour: bool,
    /// The reader of our results has gone away, which is his right.
    closed: bool,
    started: Instant,
    progress_shown: bool,
}

impl Console {
    pub fn new(choice: ColorChoice) -> Self {
        let colour = match choice {
            ColorChoice::Always => true,
            ColorChoice::Never => false,
            // no-color.org: any value but the empty one
            ColorChoice::Auto => {
                io::stdout().is_terminal() && std::env::var_os("NO_COLOR").is_none_or(|v| v.is_empty())
            }
        };
        Console { colour, closed: false, started: Instant::now(), progress_shown: false }
    }

    /// An empty page in the colours of this run.
    pub fn page(&self) -> Page {
        let terminal = terminal_size::terminal_size_of(io::stdout());
        Page::new(self.colour).on_terminal(terminal.map(|(width, _)| usize::from(width.0)))
    }

    /// Writes results. `false` where they could not be written for any other reason than a closed pipe.
    pub fn result(&mut self, text: &str) -> bool {
        self.result_bytes(text.as_bytes())
    }

    /// The same for what need not be UTF-8.
    pub fn result_bytes(&mut self, bytes: &[u8]) -> bool {
        self.clear_progress();
        if self.closed {
            return true;
        }
        let mut out = io::stdout().lock();
        match out.write_all(bytes).and_then(|()| out.flush()) {
            Ok(()) => true,
            Err(problem) if problem.kind() == io::ErrorKind::BrokenPipe => {
                self.closed = true;
                true
            }
            Err(problem) => {
                self.say(&format!("the results could not be written: {}", trouble::writing(&problem)));
                false
            }
        }
    }

    /// What came out of a step; what stood in its way is said.
    pub fn told<T>(&mut self, outcome: Result<T, String>) -> Option<T> {
        outcome.map_err(|problem| self.say(&problem)).ok()
    }

    /// Writes a document for programs, or says why there is none.
    pub fn document(&mut self, what: &str, document: Result<String, impl std::fmt::Display>) -> bool {
        let problem = |e: &dyn std::fmt::Display| format!("the {what} could not be written as JSON: {e}");
        match document {
            Ok(text) => self.result(&text),
            Err(error) => {
                self.say(&problem(&error));
                false
            }
        }
    }

    /// Says something about the run.
    pub fn say(&mut self, text: &str) {
        self.clear_progress();
        // control characters of file names stay off the terminal
        let text: String =
            text.chars().map(|c| if c.is_control() { char::REPLACEMENT_CHARACTER } else { c }).collect();
        let _ = writeln!(io::stderr(), "kneewise: {text}");
    }

    /// Shows how far a long run has come.
    pub fn progress(&mut self, done: usize, of: usize) {
        if of > 1 && self.started.elapsed() > PATIENCE && io::stderr().is_terminal() {
            let _ = write!(io::stderr(), "\r\x1b[K{done} of {of} files");
            self.progress_shown = true;
        }
    }

    fn clear_progress(&mut self) {
        if std::mem::take(&mut self.progress_shown) {
            let _ = write!(io::stderr(), "\r\x1b[K");
        }
    }
}
