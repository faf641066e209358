//! Notes about diodes, looked up by diode: the inner scope's note before the outer's, in one scope the element's
//! before its model's. What the notes say is the caller's.

use crate::circuit::directory::{Directory, depth, outward};
use crate::circuit::{Behaviour, Circuit, ElementId, Note, ScopeId};
use crate::finding::{Finding, Severity};
use crate::text::Span;
use rustc_hash::FxHashMap;
use std::collections::hash_map::Entry;

/// What notes of one kind say.
pub(crate) struct Named<T> {
    /// By element and depth of the note's scope.
    elements: FxHashMap<(ElementId, usize), (Span, T)>,
    /// By scope and lower-case model name.
    models: FxHashMap<(ScopeId, String), (Span, T)>,
    /// Lower-case names of the models, by number; empty where no note names one.
    model_names: Vec<String>,
}

impl<T> Named<T> {
    /// Reads all notes that `meaning` knows. Two on one name and level, a name that is nothing here, and an
    /// element that is no diode are findings.
    pub fn collect(
        circuit: &Circuit,
        directory: Option<&Directory<'_>>,
        word: &str,
        meaning: impl Fn(&Note) -> Option<Result<T, Finding>>,
        findings: &mut Vec<Finding>,
    ) -> Self {
        let mut named =
            Named { elements: FxHashMap::default(), models: FxHashMap::default(), model_names: Vec::new() };
        let Some(directory) = directory else { return named };
        let names: Vec<String> = circuit.models.iter().map(|m| circuit.text(m.name).to_lowercase()).collect();
        for note in &circuit.notes {
            match meaning(note) {
                None => {}
                Some(Err(finding)) => findings.push(finding),
                Some(Ok(value)) => {
                    let target = target(circuit, directory, &names, note);
                    named.insert(circuit, word, note, target, value, findings);
                }
            }
        }
        if !named.models.is_empty() {
            named.model_names = names;
        }
        named
    }

    fn insert(
        &mut self,
        circuit: &Circuit,
        word: &str,
        note: &Note,
        target: Target,
        value: T,
        findings: &mut Vec<Finding>,
    ) {
        let name = circuit.text(note.subject);
        let earlier = match target {
            Target::Diode(id) => put(self.elements.entry((id, depth(circuit, note.scope))), note.span, value),
            Target::Model(model) => put(self.models.entry((note.scope, model)), note.span, value),
            Target::Other => {
                findings.push(no_diode(word, name, note));
                None
            }
            Target::Nothing => {
                findings.push(unknown_name(name, note, "element or model"));
                None
            }
        };
        // an instance repeats the notes of its subcircuit; that is one note, not two
        if let Some(earlier) = earlier.filter(|&span| span != note.span) {
            findings.push(twice(word, name, note, earlier));
        }
    }

    /// What holds for a diode.
    pub fn of(&self, circuit: &Circuit, id: ElementId) -> Option<&T> {
        if self.elements.is_empty() && self.models.is_empty() {
            return None;
        }
        let element = circuit.element(id);
        let model = match element.behaviour {
            Behaviour::Diode { model, .. } => model.and_then(|m| self.model_names.get(m.index())),
            _ => None,
        };
        let scopes = outward(circuit, element.scope);
        let from = depth(circuit, element.scope);
        scopes.enumerate().find_map(|(up, scope)| {
            self.elements
                .get(&(id, from - up))
                .or_else(|| model.and_then(|name| self.models.get(&(scope, name.clone()))))
                .map(|(_, value)| value)
        })
    }
}

/// Puts a value where none is; else gives the place of the earlier note, which stays.
fn put<K: std::hash::Hash, T>(entry: Entry<'_, K, (Span, T)>, span: Span, value: T) -> Option<Span> {
    match entry {
        Entry::Occupied(held) => Some(held.get().0),
        Entry::Vacant(free) => {
            free.insert((span, value));
            None
        }
    }
}

enum Target {
    Diode(ElementId),
    Model(String),
    Other,
    Nothing,
}

fn target(circuit: &Circuit, directory: &Directory<'_>, models: &[String], note: &Note) -> Target {
    let name = circuit.text(note.subject);
    if let Some(id) = directory.element(note.scope, name) {
        let is_diode = matches!(circuit.element(id).behaviour, Behaviour::Diode { .. });
        return if is_diode { Target::Diode(id) } else { Target::Other };
    }
    let name = name.to_lowercase();
    if models.contains(&name) { Target::Model(name) } else { Target::Nothing }
}

/// A note that names nothing.
pub(crate) fn unknown_name(name: &str, note: &Note, wanted: &str) -> Finding {
    Finding::new("unknown-name", Severity::Warning, note.subject_span, format!("no {wanted} here is named `{name}`"))
        .label("names nothing in this circuit")
        .about(name)
        .help("A note about nothing has no effect. Correct the name, or move the note into the subcircuit it is about; inside an instance write the path, such as `X1:D3`.")
}

fn no_diode(word: &str, name: &str, note: &Note) -> Finding {
    let message = format!("`{name}` is no diode, so it has no `{word}`");
    Finding::new("unusable-note", Severity::Warning, note.subject_span, message)
        .about(name)
        .help("The note is not used. Name a diode, or a diode model to mean all its diodes.")
}

/// The second of two notes that say the same of one thing.
pub(crate) fn twice(word: &str, name: &str, note: &Note, earlier: Span) -> Finding {
    Finding::new(
        "conflicting-notes",
        Severity::Warning,
        note.span,
        format!("a second `{word}` note for `{name}`"),
    )
    .label("not used")
    .also(earlier, "the first one, which holds")
    .about(name)
    .help("Two notes of one kind on one name and level leave open which is meant. Keep one of them.")
}
