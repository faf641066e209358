//! The way from the root file to a place: the includes and instances that lead there.

use super::{Circuit, ScopeId};
use crate::finding::TrailStep;
use crate::text::{FileId, Span};

/// Include lines that lead to a file, outermost first.
pub(super) fn includes(from: &[Option<Span>], file: FileId) -> Vec<TrailStep> {
    let mut steps = Vec::new();
    let mut at = file;
    while let Some(&Some(span)) = from.get(at.0 as usize) {
        steps.push(TrailStep { span, what: "included here".to_owned() });
        at = span.file;
        if steps.len() > from.len() {
            break;
        }
    }
    steps.reverse();
    steps
}

impl Circuit {
    /// The way to a place inside an instance, outermost first: the includes that lead to the place's file, then
    /// the instances that hold it.
    pub fn trail(&self, scope: ScopeId, place: Span) -> Vec<TrailStep> {
        let mut instances = Vec::new();
        let mut at = self.scopes.get(scope.index());
        while let Some(here) = at {
            let Some(parent) = here.parent else { break };
            let what = format!("instance {} of {}", self.text(here.name), self.text(here.subcircuit));
            instances.push(TrailStep { span: here.call, what });
            at = self.scopes.get(parent.index());
        }
        instances.reverse();
        let mut steps = includes(&self.includes, place.file);
        steps.extend(instances);
        steps
    }
}
