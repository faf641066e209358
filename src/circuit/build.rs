//! Reads a root file with all its includes and expands it into the flat circuit.

use super::Circuit;
use super::expand::{Overrides, expand};
use super::parsed::Parsed;
use super::read::read_files;
use crate::config::Options;
use crate::finding::Finding;
use crate::text::{LoadProblem, Loader, Sources};
use std::path::Path;

/// What reading gives: the circuit as far as it could be read, and what stood in the way.
#[derive(Debug, Clone, Default)]
pub struct Reading {
    /// All files that were opened.
    pub sources: Sources,
    /// What they say, not yet evaluated: give it to [`expand`] for other values of parameters.
    pub parsed: Parsed,
    /// The circuit.
    pub circuit: Circuit,
    /// Findings of reading, expansion and evaluation.
    pub findings: Vec<Finding>,
}

/// Reads `root` and everything it includes.
///
/// # Errors
/// Only where the root file itself cannot be had.
pub fn read(loader: &mut dyn Loader, root: &Path, options: &Options) -> Result<Reading, LoadProblem> {
    let (sources, mut parsed) = read_files(loader, root, options)?;
    let mut findings = std::mem::take(&mut parsed.findings);
    let (circuit, more) = expand(&sources, &parsed, &Overrides::default());
    findings.extend(more);
    Ok(Reading { sources, parsed, circuit, findings })
}
