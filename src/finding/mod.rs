//! Findings as plain data: what, where, why it matters, what to do. Every stage returns them; only
//! `report/` turns them into text. Message style: the message says what is wrong here with its numbers, the
//! label says what the marked text is, the help says what to do.

mod quantity;
mod words;

pub use quantity::{Figure, compact, figure, interval, quantity};
pub use words::{count, list};

use crate::text::Span;
use std::collections::BTreeMap;

/// How serious a finding is; means the same everywhere.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Severity {
    /// Worth knowing, never by itself a reason to stop.
    Note,
    /// Very likely a mistake; a good circuit has none.
    Warning,
    /// Cannot be right, or cannot be evaluated.
    Error,
}

impl Severity {
    /// The word used in every output.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Note => "note",
            Severity::Warning => "warning",
            Severity::Error => "error",
        }
    }
}

/// A marked place with a few words.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Label {
    /// The place.
    pub span: Span,
    /// What stands there.
    pub message: String,
}

/// One step of the way from the root file to the place: an instance or an include.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TrailStep {
    /// The instance line or the include line.
    pub span: Span,
    /// Such as `instance X1 of CHARGER` or `included here`.
    pub what: String,
}

/// A replacement of the text under a span.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Edit {
    /// The text to replace.
    pub span: Span,
    /// The text to put there.
    pub replacement: String,
}

/// An edit that mends what the finding tells.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fix {
    /// What the edit does, as an instruction.
    pub title: String,
    /// Its parts; they do not overlap.
    pub edits: Vec<Edit>,
}

/// One occurrence that a rule reports.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Finding {
    /// Name of the rule, as `kneewise rules` lists it.
    pub rule: &'static str,
    /// How serious.
    pub severity: Severity,
    /// The main place.
    pub span: Span,
    /// What is wrong, in one sentence with its numbers; no final full stop.
    pub message: String,
    /// A few words at the main place; may be empty.
    pub label: String,
    /// Related places.
    pub labels: Vec<Label>,
    /// Names of the elements, nodes or models concerned, the main one first.
    pub subjects: Vec<String>,
    /// The way from the root file to the place, outermost first; empty in the root file.
    pub trail: Vec<TrailStep>,
    /// Why it matters and what to do.
    pub help: String,
    /// An edit that mends it, where one does.
    pub fix: Option<Fix>,
    /// The reason given by an `accept` note that silences it.
    pub accepted: Option<String>,
}

impl Finding {
    /// A finding with the parts that every finding has.
    pub fn new(rule: &'static str, severity: Severity, span: Span, message: impl Into<String>) -> Self {
        Finding {
            rule,
            severity,
            span,
            message: message.into(),
            label: String::new(),
            labels: Vec::new(),
            subjects: Vec::new(),
            trail: Vec::new(),
            help: String::new(),
            fix: None,
            accepted: None,
        }
    }

    /// With words at the main place.
    #[must_use]
    pub fn label(mut self, message: impl Into<String>) -> Self {
        self.label = message.into();
        self
    }

    /// With one more related place.
    #[must_use]
    pub fn also(mut self, span: Span, message: impl Into<String>) -> Self {
        self.labels.push(Label { span, message: message.into() });
        self
    }

    /// About this element, node or model.
    #[must_use]
    pub fn about(mut self, subject: impl Into<String>) -> Self {
        self.subjects.push(subject.into());
        self
    }

    /// With the reason and the remedy.
    #[must_use]
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = help.into();
        self
    }

    /// With an edit that mends it.
    #[must_use]
    pub fn fix(mut self, title: impl Into<String>, edits: Vec<Edit>) -> Self {
        self.fix = Some(Fix { title: title.into(), edits });
        self
    }
}

/// Gives findings the severity set for their rule; those of rules that are switched off are left out.
pub fn set_levels(findings: &mut Vec<Finding>, levels: &BTreeMap<String, Option<Severity>>) {
    if levels.is_empty() {
        return;
    }
    findings.retain_mut(|finding| match levels.get(finding.rule) {
        Some(Some(level)) => {
            finding.severity = *level;
            true
        }
        Some(None) => false,
        None => true,
    });
}

/// Sorts findings by place, then the most serious first, then by rule and words, so that no run differs.
pub fn sort(findings: &mut [Finding]) {
    findings.sort_by(|a, b| {
        (a.span, b.severity, a.rule, &a.message).cmp(&(b.span, a.severity, b.rule, &b.message))
    });
}
