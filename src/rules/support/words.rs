//! How many names a rule's message lists; the words are those of `finding`.

pub use crate::finding::count;

/// Most names in one message: the marked lines show the others.
const MOST: usize = 4;

/// `R1`, `R1 and R2`, `R1, R2 and C1`, `R1, R2, C1 and 4 more`.
pub fn list(names: &[String]) -> String {
    crate::finding::list(names, MOST)
}
