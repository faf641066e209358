//! The comparison of two revisions for a person: on a terminal, and as Markdown for a comment. What flips comes first,
//! then what moves, verdicts and trust, findings, wiring; each as short as it can be told.

mod markdown;
mod rows;
mod terminal;

pub use markdown::markdown;
pub use terminal::comparison;

/// Rows of one list; a review comment must stay readable.
const MOST: usize = 12;

/// What comparing one file gave.
#[derive(Debug)]
pub struct Compared {
    /// The file, as the user knows it.
    pub file: String,
    /// Its fate.
    pub fate: Fate,
    /// Both sides took what they include from one place, so that a change there does not show.
    pub shares_parts: bool,
}

/// What is said of files that share their parts.
const SHARED: &str = "Files that it includes were read as they are now, for both sides: version control hands over this file \
    alone, and does not say which revision it is of. A change in them does not show here; `kneewise compare` on \
    two directories shows it.";

/// Whether a file is in both revisions.
#[derive(Debug)]
pub enum Fate {
    /// It is, and this differs.
    Both(Box<crate::review::Comparison>),
    /// It is new; its findings.
    New(Box<crate::review::Record>),
    /// It is gone.
    Gone,
}

impl Compared {
    /// Whether there is anything to tell.
    pub fn differs(&self) -> bool {
        match &self.fate {
            Fate::Both(comparison) => !comparison.is_empty(),
            Fate::New(_) | Fate::Gone => true,
        }
    }
}
