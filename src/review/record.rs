//! What is kept of a file that was checked: its findings with the text they point into, and counts. The circuit and
//! its results are let go, so that a whole repository fits into memory.

use super::mark::marks;
use crate::analysis::Analysis;
use crate::finding::Finding;
use crate::rules::Skipped;
use crate::text::{Sources, Span};

/// One root file.
#[derive(Debug, Clone, Default)]
pub struct Record {
    /// All files that were opened; number 0 is the root.
    pub sources: Sources,
    /// Findings, sorted.
    pub findings: Vec<Finding>,
    /// Findings that an older state of the file has too, and that are therefore not among the others.
    pub known: Vec<Finding>,
    /// Rules that could not judge.
    pub skipped: Vec<Skipped>,
    /// Diode statements and what their marks would say, in order of place.
    pub states: Vec<(Span, String)>,
    /// Elements after expansion.
    pub elements: usize,
    /// Diodes after expansion.
    pub diodes: usize,
    /// Whether this is a netlist, and not a file of settings.
    pub is_netlist: bool,
}

impl Record {
    /// Of an analysis; the states of diodes only where they are wanted.
    pub fn of(analysis: Analysis, with_states: bool) -> Self {
        let states = if with_states { marks(&analysis).into_iter().collect() } else { Vec::new() };
        Record {
            states,
            elements: analysis.circuit.elements.len(),
            diodes: analysis.circuit.elements.iter().filter(|e| e.letter == b'D').count(),
            sources: analysis.sources,
            findings: analysis.findings,
            known: Vec::new(),
            skipped: analysis.skipped,
            is_netlist: true,
        }
    }

    /// Of a file of settings.
    pub fn of_settings(sources: Sources, findings: Vec<Finding>) -> Self {
        Record { sources, findings, ..Record::default() }
    }
}
