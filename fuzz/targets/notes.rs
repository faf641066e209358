//! Arbitrary text as a note: reading never panics, and what is wrong is shown inside the note.
#![no_main]

use kneewise::syntax;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|text: &str| {
    let note = format!("*@ {text}");
    if let Err(problem) = syntax::note(&note) {
        assert!(note.get(problem.start..problem.end).is_some(), "{problem:?}");
    }
});
