//! What the user may set for a run, as plain data. Reading arguments is `cli`'s, this is only their meaning.

use std::path::PathBuf;

/// Options of one analysis.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Options {
    /// `--drop`: one drop in volts for every diode.
    pub drop: Option<f64>,
    /// `--set NAME=VALUE`: sources held at a value (volts or amperes), in the order given.
    pub set: Vec<(String, f64)>,
    /// `--include-dir`: further places where includes may lie.
    pub include_dirs: Vec<PathBuf>,
    /// Find the states too (`check` and `states`), or only read and check the wiring.
    pub states: bool,
    /// The diode that `--why` asks about: its view is computed in parts of any size.
    pub why: Option<String>,
}
