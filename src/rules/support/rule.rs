//! What a rule is, as plain data.

use super::Evidence;
use crate::finding::{Finding, Severity};
use crate::operating::Operating;
use crate::swing::Swing;

/// What a rule needs before it can judge, and its check.
pub enum Check {
    /// The findings are made while reading (`syntax`, `circuit`); the file documents them.
    Reading,
    /// Judges the wiring.
    Wiring(fn(&Evidence<'_>) -> Vec<Finding>),
    /// Judges the states.
    States(fn(&Evidence<'_>, &Operating) -> Vec<Finding>),
    /// Judges what happens over time.
    Time(fn(&Evidence<'_>, &Operating, &Swing) -> Vec<Finding>),
    /// Judges the notes against all other findings; made by `run` after the other rules.
    Notes,
}

/// The groups of rules, in the order in which a file meets them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Group {
    /// What could not be read, or is read otherwise than it looks.
    Reading,
    /// How elements are joined.
    Wiring,
    /// Which way round they lie.
    Orientation,
    /// What the states tell.
    States,
    /// How far the constant-drop answer may be believed.
    Trust,
    /// What happens over time.
    Time,
    /// What notes expect and allow.
    Notes,
    /// What may hurt somebody.
    Caution,
    /// What the user has set.
    Settings,
}

impl Group {
    /// All of them, in order.
    pub const ALL: [Group; 9] = [
        Group::Reading,
        Group::Wiring,
        Group::Orientation,
        Group::States,
        Group::Trust,
        Group::Time,
        Group::Notes,
        Group::Caution,
        Group::Settings,
    ];

    /// Its name in listings.
    pub fn word(self) -> &'static str {
        match self {
            Group::Reading => "reading",
            Group::Wiring => "wiring",
            Group::Orientation => "orientation",
            Group::States => "states",
            Group::Trust => "trust",
            Group::Time => "time",
            Group::Notes => "notes",
            Group::Caution => "caution",
            Group::Settings => "settings",
        }
    }
}

/// One rule.
pub struct Rule {
    /// Name, in words joined by hyphens.
    pub name: &'static str,
    /// Group in the listing.
    pub group: Group,
    /// Its severity.
    pub severity: Severity,
    /// The severity of some of its findings, where they are worse or milder.
    pub also: Option<Severity>,
    /// One line.
    pub summary: &'static str,
    /// Why it matters.
    pub why: &'static str,
    /// What to do.
    pub remedy: &'static str,
    /// The published result it rests on, where it does.
    pub source: Option<&'static str>,
    /// A netlist that gives exactly one finding of this rule and no other finding of warning or error.
    pub failing: &'static str,
    /// A netlist that gives no finding at all.
    pub passing: &'static str,
    /// The check.
    pub check: Check,
}

impl Rule {
    /// The worst that it finds.
    pub fn worst(&self) -> Severity {
        self.severity.max(self.also.unwrap_or(Severity::Note))
    }

    /// As it is printed: `warning`; `note, warning` where it has two severities.
    pub fn severity_words(&self) -> String {
        match self.also {
            None => self.severity.word().to_owned(),
            Some(also) => format!("{}, {}", self.severity.min(also).word(), self.worst().word()),
        }
    }
}

/// A rule that could not judge.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Skipped {
    /// The rule's name.
    pub rule: &'static str,
    /// Why.
    pub reason: String,
}
