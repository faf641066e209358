//! The counts at the end of a run.

use super::paint::{Ink, Page};
use crate::finding::{self, Finding, Severity};
use crate::review::Record;
use serde::Serialize;

/// Counts over all root files of a run; accepted findings count nowhere else.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize)]
pub struct Summary {
    /// Root files.
    pub files: usize,
    /// Findings that are errors.
    pub errors: usize,
    /// Findings that are warnings.
    pub warnings: usize,
    /// Findings that are notes.
    pub notes: usize,
    /// Elements after expansion.
    pub elements: usize,
    /// Diodes after expansion.
    pub diodes: usize,
    /// Findings that a note of the netlist accepts.
    pub accepted: usize,
    /// Findings that the state compared with has too; they count nowhere else either.
    pub known: usize,
}

impl Summary {
    /// Counts one more file.
    pub fn add(&mut self, record: &Record) {
        self.files += usize::from(record.is_netlist);
        self.elements += record.elements;
        self.diodes += record.diodes;
        self.known += record.known.len();
        self.count_all(&record.findings);
    }

    /// Counts findings.
    pub fn count_all(&mut self, findings: &[Finding]) {
        for finding in findings {
            self.count(finding);
        }
    }

    fn count(&mut self, finding: &Finding) {
        let counter = match finding.severity {
            _ if finding.accepted.is_some() => &mut self.accepted,
            Severity::Error => &mut self.errors,
            Severity::Warning => &mut self.warnings,
            Severity::Note => &mut self.notes,
        };
        *counter += 1;
    }

    /// The most serious severity that occurs, accepted findings left out.
    pub fn worst(&self) -> Option<Severity> {
        match self {
            Summary { errors: 1.., .. } => Some(Severity::Error),
            Summary { warnings: 1.., .. } => Some(Severity::Warning),
            Summary { notes: 1.., .. } => Some(Severity::Note),
            _ => None,
        }
    }

    /// `no errors, 1 warning`
    pub fn troubles(&self) -> String {
        format!("{}, {}", counted(self.errors, "error"), counted(self.warnings, "warning"))
    }

    /// `1 file, 12 elements, 3 diodes: no errors, 1 warning, no notes`
    pub fn write(&self, page: &mut Page) {
        let scope =
            [counted(self.files, "file"), counted(self.elements, "element"), counted(self.diodes, "diode")];
        page.plain(&scope.join(", ")).plain(": ");
        let results = [
            (self.errors, "error", Ink::Error),
            (self.warnings, "warning", Ink::Warning),
            (self.notes, "note", Ink::Note),
        ];
        for (n, (count, noun, ink)) in results.into_iter().enumerate() {
            page.plain(if n == 0 { "" } else { ", " });
            match count {
                0 => page.plain(&counted(count, noun)),
                _ => page.ink(ink, &counted(count, noun)),
            };
        }
        let aside: Vec<String> = [(self.accepted, "accepted"), (self.known, "known before")]
            .iter()
            .filter(|(count, _)| *count > 0)
            .map(|(count, what)| format!("{count} {what}"))
            .collect();
        if !aside.is_empty() {
            page.plain(&format!(" ({})", aside.join(", ")));
        }
        page.end();
    }
}

/// `no diodes`, `1 diode`, `12 diodes`.
pub(super) fn counted(count: usize, noun: &str) -> String {
    match count {
        0 => format!("no {noun}s"),
        n => finding::count(n, noun),
    }
}
