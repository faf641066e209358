//! Nodes that notes name. A supplied node is held; a watched one is meant to be looked at, so it may end there.

use crate::circuit::{Circuit, NodeId, NoteKind, ScopeId};
use rustc_hash::FxHashMap;

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
        let index = Index::of(circuit);
        for note in circuit.notes.iter().filter(|note| names_nodes(&note.kind)) {
            let subject = index.find(circuit, note.scope, circuit.text(note.subject));
            match &note.kind {
                NoteKind::Supply { .. } => noted.supplied.extend(subject),
                NoteKind::Watch { other } => {
                    noted.watched.extend(subject);
                    let other = other.and_then(|o| index.find(circuit, note.scope, circuit.text(o)));
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

/// Nodes by scope and folded name.
struct Index {
    nodes: FxHashMap<(ScopeId, String), NodeId>,
}

impl Index {
    fn of(circuit: &Circuit) -> Self {
        let mut nodes = FxHashMap::default();
        for (n, node) in circuit.nodes.iter().enumerate() {
            nodes.entry((node.scope, circuit.text(node.name).to_lowercase())).or_insert(NodeId::new(n));
        }
        nodes.insert((ScopeId::ROOT, "gnd".into()), NodeId::GROUND);
        nodes.insert((ScopeId::ROOT, "0".into()), NodeId::GROUND);
        Index { nodes }
    }

    /// The node that `name` means in `scope`: its own, or one below by its path, or one of the scopes above.
    fn find(&self, circuit: &Circuit, scope: ScopeId, name: &str) -> Option<NodeId> {
        let mut at = scope;
        loop {
            if let Some(&node) = self.nodes.get(&(at, name.to_lowercase())) {
                return Some(node);
            }
            if let Some(node) = self.below(circuit, at, name) {
                return Some(node);
            }
            at = circuit.scopes.get(at.index())?.parent?;
        }
    }

    fn below(&self, circuit: &Circuit, scope: ScopeId, path: &str) -> Option<NodeId> {
        let (instances, name) = path.rsplit_once(':')?;
        let mut at = scope;
        for step in instances.split(':') {
            let next = circuit
                .scopes
                .iter()
                .position(|s| s.parent == Some(at) && circuit.text(s.name).eq_ignore_ascii_case(step))?;
            at = ScopeId::new(next);
        }
        self.nodes.get(&(at, name.to_lowercase())).copied()
    }
}
