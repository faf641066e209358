//! Reads a root file with all its includes and expands it into the flat circuit.

use super::Circuit;
use crate::config::Options;
use crate::finding::Finding;
use crate::text::{LoadProblem, Loader, Sources};
use std::path::Path;

/// What reading gives: the circuit as far as it could be read, and what stood in the way.
#[derive(Debug, Clone, Default)]
pub struct Reading {
    /// All files that were opened.
    pub sources: Sources,
    /// The circuit.
    pub circuit: Circuit,
    /// Findings of reading, expansion and evaluation.
    pub findings: Vec<Finding>,
}

/// Reads `root` and everything it includes.
///
/// # Errors
/// Only where the root file itself cannot be had.
pub fn read(loader: &mut dyn Loader, root: &Path, _options: &Options) -> Result<Reading, LoadProblem> {
    let bytes = loader.load(root)?;
    let mut reading = Reading::default();
    reading.sources.add(root.display().to_string(), &bytes);
    Ok(reading)
}
