//! Typed numbers of the circuit's parts, and the interner of names.

use hashbrown::HashTable;
use rustc_hash::FxHasher;
use std::hash::Hasher;

macro_rules! id {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
        pub struct $name(pub u32);
        impl $name {
            /// From a position in the circuit's list.
            pub fn new(index: usize) -> Self {
                $name(u32::try_from(index).unwrap_or(u32::MAX))
            }
            /// Position in the circuit's list.
            pub fn index(self) -> usize {
                self.0 as usize
            }
        }
    };
}

id!(
    /// Number of an element.
    ElementId
);
id!(
    /// Number of a node; 0 is ground.
    NodeId
);
id!(
    /// Number of a model.
    ModelId
);
id!(
    /// Number of an instance; 0 is the root circuit.
    ScopeId
);
id!(
    /// Number of a spelling.
    Symbol
);

impl NodeId {
    /// Ground.
    pub const GROUND: NodeId = NodeId(0);
}

impl ScopeId {
    /// The root circuit.
    pub const ROOT: ScopeId = ScopeId(0);
}

/// Spellings, each kept once, case kept as written. Equality of names that ignores case is the caller's.
#[derive(Debug, Clone, Default)]
pub struct Names {
    bytes: String,
    ends: Vec<u32>,
    table: HashTable<u32>,
}

impl PartialEq for Names {
    fn eq(&self, other: &Self) -> bool {
        self.bytes == other.bytes && self.ends == other.ends
    }
}

impl Names {
    /// The number of a spelling, new or known.
    pub fn intern(&mut self, text: &str) -> Symbol {
        let hash = hash(text);
        let Names { bytes, ends, table } = self;
        if let Some(&known) = table.find(hash, |&id| slice(bytes, ends, id) == text) {
            return Symbol(known);
        }
        let id = Symbol::new(ends.len()).0;
        bytes.push_str(text);
        ends.push(u32::try_from(bytes.len()).unwrap_or(u32::MAX));
        table.insert_unique(hash, id, |&id| self::hash(slice(bytes, ends, id)));
        Symbol(id)
    }

    /// The spelling; empty for a number that is not ours.
    pub fn text(&self, symbol: Symbol) -> &str {
        slice(&self.bytes, &self.ends, symbol.0)
    }
}

fn slice<'a>(bytes: &'a str, ends: &[u32], id: u32) -> &'a str {
    let id = id as usize;
    let start = if id == 0 { 0 } else { ends.get(id - 1).map_or(0, |&e| e as usize) };
    let end = ends.get(id).map_or(start, |&e| e as usize);
    bytes.get(start..end).unwrap_or("")
}

fn hash(text: &str) -> u64 {
    let mut hasher = FxHasher::default();
    hasher.write(text.as_bytes());
    hasher.finish()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spellings_come_back() {
        let mut names = Names::default();
        let ids: Vec<_> = ["out", "OUT", "", "in", "out"].iter().map(|n| names.intern(n)).collect();
        assert_eq!(ids[0], ids[4]);
        assert_ne!(ids[0], ids[1]);
        assert_eq!(names.text(ids[1]), "OUT");
        assert_eq!(names.text(ids[2]), "");
        assert_eq!(names.text(ids[3]), "in");
    }
}
