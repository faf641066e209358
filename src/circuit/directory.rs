//! Finds what a name means: elements, nodes and scopes by path (`X1:D3`), case ignored. Built only where
//! something asks by name. What the named thing then does is not known here.

use super::ids::Names;
use super::{Circuit, ElementId, NodeId, ScopeId, Symbol};
use std::borrow::Cow;

/// All names of a circuit.
pub(crate) struct Directory<'a> {
    circuit: &'a Circuit,
    elements: Index,
    nodes: Index,
    children: Index,
}

impl<'a> Directory<'a> {
    /// Reads every name once.
    pub fn of(circuit: &'a Circuit) -> Self {
        let key = |scope: ScopeId, name: Symbol| (scope, hash(circuit.text(name)));
        let child = |scope: &super::Scope| match scope.parent {
            Some(parent) => key(parent, scope.name),
            None => (ScopeId(u32::MAX), 0), // the root is nobody's child
        };
        Directory {
            circuit,
            elements: Index::of(circuit.elements.iter().map(|e| key(e.scope, e.name))),
            nodes: Index::of(circuit.nodes.iter().map(|n| key(n.scope, n.name))),
            children: Index::of(circuit.scopes.iter().map(child)),
        }
    }

    /// The element of that name or path, seen from `scope`.
    pub fn element(&self, scope: ScopeId, name: &str) -> Option<ElementId> {
        let named = |at: u32| self.circuit.elements[at as usize].name;
        self.find(scope, name, &self.elements, named).map(ElementId)
    }

    /// The node of that name or path, seen from `scope`; `gnd` is `0`. Globals are the root's.
    pub fn node(&self, scope: ScopeId, name: &str) -> Option<NodeId> {
        if name == "0" || name.eq_ignore_ascii_case("gnd") {
            return Some(NodeId::GROUND);
        }
        let named = |at: u32| self.circuit.nodes[at as usize].name;
        let find = |scope| self.find(scope, name, &self.nodes, named);
        find(scope).or_else(|| find(ScopeId::ROOT)).map(NodeId)
    }

    fn find(
        &self,
        scope: ScopeId,
        name: &str,
        index: &Index,
        named: impl Copy + Fn(u32) -> Symbol,
    ) -> Option<u32> {
        // of two of one name the first is meant; the second has a finding of its own
        let first = |index: &Index, scope, name: &str, named: &dyn Fn(u32) -> Symbol| {
            let mut alike = index.alike(scope, hash(name));
            alike.find(|&at| is_same(self.circuit.text(named(at)), name))
        };
        if let Some(found) = first(index, scope, name, &named) {
            return Some(found);
        }
        let (instance, rest) = name.split_once(':')?;
        let inner = first(&self.children, scope, instance, &|at| self.circuit.scopes[at as usize].name)?;
        self.find(ScopeId(inner), rest, index, named)
    }
}

/// Things by the scope they stand in and the hash of their name, those of one key in their order.
struct Index(Vec<((ScopeId, u32), u32)>);

impl Index {
    fn of(keys: impl Iterator<Item = (ScopeId, u32)>) -> Self {
        let mut list: Vec<_> = keys.zip(0..).collect();
        list.sort_unstable();
        Index(list)
    }

    fn alike(&self, scope: ScopeId, hash: u32) -> impl Iterator<Item = u32> + '_ {
        let key = (scope, hash);
        let first = self.0.partition_point(|(k, _)| *k < key);
        self.0[first..].iter().take_while(move |(k, _)| *k == key).map(|(_, at)| *at)
    }
}

/// In lower case, where that takes more than the letters of ASCII.
fn folded(text: &str) -> Cow<'_, str> {
    if text.is_ascii() { text.into() } else { text.to_lowercase().into() }
}

/// Alike for names that differ in case only.
fn hash(text: &str) -> u32 {
    Names::hash(&folded(text))
}

fn is_same(a: &str, b: &str) -> bool {
    a.eq_ignore_ascii_case(b)
        || (!(a.is_ascii() && b.is_ascii()) && folded(a).eq_ignore_ascii_case(&folded(b)))
}

/// The scope and all that hold it, innermost first.
pub(crate) fn outward(circuit: &Circuit, scope: ScopeId) -> impl Iterator<Item = ScopeId> + '_ {
    std::iter::successors(Some(scope), |s| circuit.scopes.get(s.index()).and_then(|s| s.parent))
}

/// How many instances stand around the scope.
pub(crate) fn depth(circuit: &Circuit, scope: ScopeId) -> usize {
    outward(circuit, scope).count() - 1
}
