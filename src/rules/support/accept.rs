//! `accept` notes: findings that the people who know the circuit have looked at and keep, with their reason.

use super::super::{accept_without_reason, idle_accept};
use super::Evidence;
use crate::circuit::{Note, NoteKind, ScopeId};
use crate::finding::{Finding, Severity};
use crate::text::Span;
use rustc_hash::FxHashMap;

/// Marks the findings that `accept` notes silence with the reason given; the findings about accepts that give no reason
/// or silence nothing. `ran` tells whether the rule of that name has judged at all in this run.
pub fn accept(evidence: &Evidence<'_>, findings: &mut [Finding], ran: impl Fn(&str) -> bool) -> Vec<Finding> {
    let mut own = Vec::new();
    for copies in copies(&evidence.circuit.notes) {
        let Some(note) = copies.first() else { continue };
        let NoteKind::Accept { rule, reason } = &note.kind else { continue };
        let Some(reason) = reason.as_deref().filter(|r| !r.trim().is_empty()) else {
            own.push(accept_without_reason::finding(evidence, note, rule));
            continue;
        };
        let mut silenced = false;
        for finding in findings.iter_mut().filter(|f| f.rule == rule.as_str()) {
            if copies.iter().any(|copy| concerns(evidence, copy, finding)) {
                finding.accepted.get_or_insert_with(|| reason.to_owned());
                silenced = true;
            }
        }
        if !silenced && ran(rule) {
            own.push(idle_accept::finding(evidence, note, rule));
        }
    }
    own
}

/// The notes by the line they stand on: one in a subcircuit has a copy for each instance.
fn copies(notes: &[Note]) -> Vec<Vec<&Note>> {
    let mut by_line: Vec<Vec<&Note>> = Vec::new();
    let mut place: FxHashMap<Span, usize> = FxHashMap::default();
    for note in notes.iter().filter(|n| matches!(n.kind, NoteKind::Accept { .. })) {
        let at = *place.entry(note.span).or_insert(by_line.len());
        match by_line.get_mut(at) {
            Some(copies) => copies.push(note),
            None => by_line.push(vec![note]),
        }
    }
    by_line
}

/// The finding is about the note's subject: by its full name, by its name inside the note's own subcircuit, or
/// whatever it is about where the note names nothing.
fn concerns(evidence: &Evidence<'_>, note: &Note, finding: &Finding) -> bool {
    let subject = evidence.circuit.text(note.subject);
    let path = instance_path(evidence, note.scope);
    if subject.is_empty() {
        return path.is_empty() || finding.subjects.iter().any(|s| starts_with(s, &path));
    }
    finding.subjects.iter().any(|named| {
        let full = format!("{path}{subject}");
        named.eq_ignore_ascii_case(&full) || (named == "0" && subject.eq_ignore_ascii_case("gnd"))
    })
}

fn starts_with(name: &str, path: &str) -> bool {
    name.get(..path.len()).is_some_and(|start| start.eq_ignore_ascii_case(path))
}

/// `X1:X2:` for an instance; empty for the root.
fn instance_path(evidence: &Evidence<'_>, scope: ScopeId) -> String {
    let mut path = String::new();
    let mut at = evidence.circuit.scopes.get(scope.index());
    while let Some(here) = at {
        let Some(parent) = here.parent else { break };
        path.insert_str(0, &format!("{}:", evidence.circuit.text(here.name)));
        at = evidence.circuit.scopes.get(parent.index());
    }
    path
}

/// The words that both rules about accepts share.
pub fn about_note(evidence: &Evidence<'_>, rule: &'static str, note: &Note, message: String) -> Finding {
    let mut finding = Finding::new(rule, Severity::Warning, note.span, message);
    finding.trail = evidence.circuit.trail(note.scope, note.span);
    let subject = evidence.circuit.text(note.subject);
    if subject.is_empty() { finding } else { finding.about(subject) }
}
