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

/// Spellings, each kept once, case kept as written; spellings that differ only in the case of ASCII letters
/// know the first of them. All of them share one hash, so that a look-up hashes once and folds nothing.
#[derive(Debug, Clone, Default)]
pub struct Names {
    bytes: String,
    ends: Vec<u32>,
    folded: Vec<u32>,
    table: HashTable<u32>,
}

impl PartialEq for Names {
    fn eq(&self, other: &Self) -> bool {
        self.bytes == other.bytes && self.ends == other.ends
    }
}

impl Names {
    /// Makes room for so many spellings.
    pub fn reserve(&mut self, count: usize) {
        let Names { bytes, ends, folded, table } = self;
        bytes.reserve(count.saturating_mul(6));
        ends.reserve(count);
        folded.reserve(count);
        table.reserve(count, |&id| hash(slice(bytes, ends, id)));
    }

    /// The number of a spelling, new or known.
    pub fn intern(&mut self, text: &str) -> Symbol {
        let hash = hash(text);
        let Names { bytes, ends, folded, table } = self;
        if let Some(&known) = table.find(hash, |&id| slice(bytes, ends, id) == text) {
            return Symbol(known);
        }
        let first = table.find(hash, |&id| slice(bytes, ends, id).eq_ignore_ascii_case(text)).copied();
        let id = Symbol::new(ends.len()).0;
        bytes.push_str(text);
        ends.push(u32::try_from(bytes.len()).unwrap_or(u32::MAX));
        folded.push(first.map_or(id, |first| folded.get(first as usize).copied().unwrap_or(first)));
        table.insert_unique(hash, id, |&id| self::hash(slice(bytes, ends, id)));
        Symbol(id)
    }

    /// The number of a name already known in any case, as [`Names::fold`] gives it.
    pub fn find(&self, text: &str) -> Option<Symbol> {
        let Names { bytes, ends, table, .. } = self;
        let found = table.find(hash(text), |&id| slice(bytes, ends, id).eq_ignore_ascii_case(text))?;
        Some(self.fold(Symbol(*found)))
    }

    /// The first spelling of the same name in any case: two names are equal where these are.
    pub fn fold(&self, symbol: Symbol) -> Symbol {
        self.folded.get(symbol.index()).map_or(symbol, |&first| Symbol(first))
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

/// A hash that is blind to the case of ASCII letters (and, harmlessly, to bit 5 of all other characters).
fn hash(text: &str) -> u64 {
    const FOLD: u64 = 0x2020_2020_2020_2020;
    let mut hasher = FxHasher::default();
    let (eights, rest) = text.as_bytes().as_chunks::<8>();
    for &eight in eights {
        hasher.write_u64(u64::from_le_bytes(eight) | FOLD);
    }
    let mut last = [0; 8];
    for (to, from) in last.iter_mut().zip(rest) {
        *to = *from;
    }
    hasher.write_u64(u64::from_le_bytes(last) | FOLD);
    hasher.write_usize(text.len());
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
        assert_eq!(names.fold(ids[1]), ids[0]);
        assert_eq!(names.find("oUt"), Some(ids[0]));
    }
}
