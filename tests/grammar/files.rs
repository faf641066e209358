//! The grammar's files.

use crate::abnf::Grammar;
use std::path::PathBuf;

/// Rules that sentences begin with.
pub const STARTS: [&str; 5] = ["netlist", "statement", "number", "expression", "token"];

/// The folder `grammar/`.
pub fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("grammar")
}

/// Both grammars as one.
pub fn grammar() -> Grammar {
    let text = |name: &str| std::fs::read_to_string(folder().join(name)).unwrap();
    Grammar::read(&[&text("netlist.abnf"), &text("notes.abnf")], &STARTS)
}
