//! Nodes that notes name. A supplied node is held; a watched one is meant to be looked at, so it may end there.

use crate::circuit::directory::Directory;
use crate::circuit::{Circuit, NodeId, NoteKind};

/// Nodes named by notes, sorted.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Noted {
    /// Held by a `supply` note.
    pub supplied: Vec<NodeId>,
    /// Named by a `watch` note or an `expect v(…)` note.
    pub watched: Vec<NodeId>,
}

impl Noted {
    pub(super) fn of(circuit: &Circuit) -> Self {
        let mut noted = Noted::default();
        let names_nodes = |kind: &NoteKind| match kind {
            NoteKind::Supply { .. } | NoteKind::Watch { .. } => true,
            NoteKind::Expect(e) => e.is_voltage,
            _ => false,
        };
        if !circuit.notes.iter().any(|note| names_nodes(&note.kind)) {
            return noted;
        }
        let directory = Directory::of(circuit);
        for note in circuit.notes.iter().filter(|note| names_nodes(&note.kind)) {
            let subject = directory.node(note.scope, circuit.text(note.subject));
            match &note.kind {
                NoteKind::Supply { .. } => noted.supplied.extend(subject),
                NoteKind::Watch { other, .. } => {
                    noted.watched.extend(subject);
                    let other = other.and_then(|o| directory.node(note.scope, circuit.text(o)));
                    noted.watched.extend(other);
                }
                _ => noted.watched.extend(subject),
            }
        }
        for list in [&mut noted.supplied, &mut noted.watched] {
            list.sort();
            list.dedup();
        }
        noted
    }

    /// A note looks at this node.
    pub fn is_watched(&self, node: NodeId) -> bool {
        self.watched.binary_search(&node).is_ok()
    }

    /// A note holds this node.
    pub fn is_supplied(&self, node: NodeId) -> bool {
        self.supplied.binary_search(&node).is_ok()
    }
}
