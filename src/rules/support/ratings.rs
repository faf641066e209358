//! Which `rating` note holds for which element, read once. What the element then bears is the rules' to judge.

use super::Evidence;
use crate::circuit::directory::{Directory, depth, outward};
use crate::circuit::{Behaviour, Circuit, ElementId, Note, NoteKind, ScopeId};
use rustc_hash::FxHashMap;
use std::collections::BTreeMap;

/// One quantity that a note limits for an element.
#[derive(Clone, Copy)]
pub struct Limit<'a> {
    /// The note.
    pub note: &'a Note,
    /// `i`, `vr` or `p`.
    pub key: &'a str,
    /// Amperes, volts or watts.
    pub limit: f64,
    /// How near the note stands: depth of its scope, and whether it names the element rather than its model.
    nearness: (usize, bool),
}

/// The limits of every element that has any, in the order of the elements: of each quantity the innermost note's, and
/// the element's own before its model's.
pub fn ratings<'a>(circuit: &'a Circuit) -> BTreeMap<ElementId, Vec<Limit<'a>>> {
    let mut limits: BTreeMap<ElementId, Vec<Limit<'a>>> = BTreeMap::new();
    if !circuit.notes.iter().any(|n| matches!(n.kind, NoteKind::Rating(_))) {
        return limits;
    }
    let directory = Directory::of(circuit);
    let by_model = by_model(circuit);
    for note in &circuit.notes {
        let NoteKind::Rating(list) = &note.kind else { continue };
        let name = circuit.text(note.subject);
        let level = depth(circuit, note.scope);
        let own = directory.element(note.scope, name);
        let of_model = by_model.get(&(note.scope, name.to_lowercase())).filter(|_| own.is_none());
        for &id in own.iter().chain(of_model.into_iter().flatten()) {
            let known = limits.entry(id).or_default();
            for (key, limit) in list {
                keep_nearest(known, Limit { note, key, limit: *limit, nearness: (level, own.is_some()) });
            }
        }
    }
    limits
}

fn keep_nearest<'a>(known: &mut Vec<Limit<'a>>, new: Limit<'a>) {
    match known.iter_mut().find(|l| l.key == new.key) {
        Some(old) if old.nearness < new.nearness => *old = new,
        Some(_) => {}
        None => known.push(new),
    }
}

/// The diodes of each model that a note in each scope speaks for: those in that instance and inside it.
fn by_model(circuit: &Circuit) -> FxHashMap<(ScopeId, String), Vec<ElementId>> {
    let mut diodes: FxHashMap<(ScopeId, String), Vec<ElementId>> = FxHashMap::default();
    for (id, element) in circuit.elements() {
        let Behaviour::Diode { model: Some(model), .. } = element.behaviour else { continue };
        let name = circuit.text(circuit.model(model).name).to_lowercase();
        for scope in outward(circuit, element.scope) {
            diodes.entry((scope, name.clone())).or_default().push(id);
        }
    }
    diodes
}

impl Evidence<'_> {
    /// The reverse voltage that a note allows an element, and the note.
    pub(in crate::rules) fn reverse_rating(&self, id: ElementId) -> Option<(f64, &Note)> {
        let limits = self.ratings().get(&id)?;
        limits.iter().find(|l| l.key == "vr").map(|l| (l.limit, l.note))
    }
}
