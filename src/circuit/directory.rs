//! Finds what a name means: elements, nodes and scopes by path (`X1:D3`), case ignored. Built only where
//! something asks by name. What the named thing then does is not known here.

use super::{Circuit, ElementId, NodeId, ScopeId, Symbol};
use rustc_hash::FxHashMap;

/// All names of a circuit.
pub(crate) struct Directory {
    /// Lower-case spelling to its number.
    folded: FxHashMap<String, u32>,
    elements: FxHashMap<(ScopeId, u32), ElementId>,
    nodes: FxHashMap<(ScopeId, u32), NodeId>,
    children: FxHashMap<(ScopeId, u32), ScopeId>,
}

impl Directory {
    /// Reads every name once.
    pub fn of(circuit: &Circuit) -> Self {
        let mut folder = Folder { folded: FxHashMap::default(), of_symbol: FxHashMap::default() };
        let mut directory = Directory {
            folded: FxHashMap::default(),
            elements: FxHashMap::default(),
            nodes: FxHashMap::default(),
            children: FxHashMap::default(),
        };
        for (id, element) in circuit.elements() {
            let name = folder.fold(circuit, element.name);
            // of two elements of one name the first is meant; the second has a finding of its own
            directory.elements.entry((element.scope, name)).or_insert(id);
        }
        for (n, node) in circuit.nodes.iter().enumerate() {
            let name = folder.fold(circuit, node.name);
            directory.nodes.entry((node.scope, name)).or_insert(NodeId::new(n));
        }
        for (n, scope) in circuit.scopes.iter().enumerate() {
            if let Some(parent) = scope.parent {
                let name = folder.fold(circuit, scope.name);
                directory.children.entry((parent, name)).or_insert(ScopeId::new(n));
            }
        }
        directory.folded = folder.folded;
        directory
    }

    fn folded(&self, text: &str) -> Option<u32> {
        self.folded.get(&text.to_lowercase()).copied()
    }

    /// The element of that name or path, seen from `scope`.
    pub fn element(&self, scope: ScopeId, name: &str) -> Option<ElementId> {
        self.find(scope, name, &self.elements)
    }

    /// The node of that name or path, seen from `scope`; `gnd` is `0`. Globals are the root's.
    pub fn node(&self, scope: ScopeId, name: &str) -> Option<NodeId> {
        if name == "0" || name.eq_ignore_ascii_case("gnd") {
            return Some(NodeId::GROUND);
        }
        self.find(scope, name, &self.nodes).or_else(|| self.find(ScopeId::ROOT, name, &self.nodes))
    }

    fn find<T: Copy>(&self, scope: ScopeId, name: &str, map: &FxHashMap<(ScopeId, u32), T>) -> Option<T> {
        let whole = self.folded(name).and_then(|n| map.get(&(scope, n)));
        if let Some(&found) = whole {
            return Some(found);
        }
        let (instance, rest) = name.split_once(':')?;
        let inner = *self.children.get(&(scope, self.folded(instance)?))?;
        self.find(inner, rest, map)
    }
}

/// Folds each distinct spelling once.
struct Folder {
    folded: FxHashMap<String, u32>,
    of_symbol: FxHashMap<Symbol, u32>,
}

impl Folder {
    fn fold(&mut self, circuit: &Circuit, symbol: Symbol) -> u32 {
        if let Some(&known) = self.of_symbol.get(&symbol) {
            return known;
        }
        let next = self.folded.len() as u32;
        let number = *self.folded.entry(circuit.text(symbol).to_lowercase()).or_insert(next);
        self.of_symbol.insert(symbol, number);
        number
    }
}

/// The scope and all that hold it, innermost first.
pub(crate) fn outward(circuit: &Circuit, scope: ScopeId) -> impl Iterator<Item = ScopeId> + '_ {
    std::iter::successors(Some(scope), |s| circuit.scopes.get(s.index()).and_then(|s| s.parent))
}

/// How many instances stand around the scope.
pub(crate) fn depth(circuit: &Circuit, scope: ScopeId) -> usize {
    outward(circuit, scope).count() - 1
}
