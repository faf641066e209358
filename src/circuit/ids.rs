//! Typed numbers of the circuit's parts, and the interner of names.

use hashbrown::HashTable;
use rustc_hash::FxHashMap;

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
    /// Spellings that are not the first of their name, with the first.
    variants: FxHashMap<u32, u32>,
    table: HashTable<Spelling>,
}

impl PartialEq for Names {
    fn eq(&self, other: &Self) -> bool {
        self.bytes == other.bytes && self.ends == other.ends
    }
}

/// A spelling in the table: its number and its bytes, so that comparing needs no second look-up.
#[derive(Debug, Clone, Copy)]
struct Spelling {
    id: u32,
    start: u32,
    length: u32,
}

impl Spelling {
    fn text(self, bytes: &[u8]) -> &[u8] {
        let start = self.start as usize;
        bytes.get(start..start + self.length as usize).unwrap_or_default()
    }
}

impl Names {
    /// Makes room for so many spellings.
    pub fn reserve(&mut self, count: usize) {
        let Names { bytes, ends, table, .. } = self;
        bytes.reserve(count.saturating_mul(6));
        ends.reserve(count);
        table.reserve(count, |s| hash(s.text(bytes.as_bytes())));
    }

    /// The number of a spelling, new or known.
    pub fn intern(&mut self, text: &str) -> Symbol {
        let hash = hash(text.as_bytes());
        let Names { bytes, ends, variants, table } = self;
        if let Some(known) = table.find(hash, |s| s.text(bytes.as_bytes()) == text.as_bytes()) {
            return Symbol(known.id);
        }
        let same = |s: &Spelling| s.text(bytes.as_bytes()).eq_ignore_ascii_case(text.as_bytes());
        let first = table.find(hash, same).map(|s| s.id);
        let id = Symbol::new(ends.len()).0;
        let start = u32::try_from(bytes.len()).unwrap_or(u32::MAX);
        bytes.push_str(text);
        ends.push(u32::try_from(bytes.len()).unwrap_or(u32::MAX));
        if let Some(first) = first {
            variants.insert(id, variants.get(&first).copied().unwrap_or(first));
        }
        let spelling = Spelling { id, start, length: u32::try_from(text.len()).unwrap_or(u32::MAX) };
        table.insert_unique(hash, spelling, |s| self::hash(s.text(bytes.as_bytes())));
        Symbol(id)
    }

    /// A number for a spelling that is not to be looked up here, with its case-blind hash: the names of elements,
    /// nearly all of which are new, would only make the table too large for the caches.
    pub fn append(&mut self, text: &str) -> (Symbol, u32) {
        let id = Symbol::new(self.ends.len());
        self.bytes.push_str(text);
        self.ends.push(u32::try_from(self.bytes.len()).unwrap_or(u32::MAX));
        (id, Names::short_hash(text))
    }

    /// The hash that [`Names::append`] gives.
    pub fn short_hash(text: &str) -> u32 {
        (hash(text.as_bytes()) >> 32) as u32
    }

    /// The number of a name already known in any case, as [`Names::fold`] gives it.
    pub fn find(&self, text: &str) -> Option<Symbol> {
        let text = text.as_bytes();
        let same = |s: &Spelling| s.text(self.bytes.as_bytes()).eq_ignore_ascii_case(text);
        let found = self.table.find(hash(text), same)?;
        Some(self.fold(Symbol(found.id)))
    }

    /// The first spelling of the same name in any case: two names are equal where these are.
    pub fn fold(&self, symbol: Symbol) -> Symbol {
        if self.variants.is_empty() {
            return symbol;
        }
        self.variants.get(&symbol.0).map_or(symbol, |&first| Symbol(first))
    }

    /// Gives up looking names up: only their text is wanted from here on.
    pub fn seal(&mut self) {
        self.table = HashTable::new();
        self.bytes.shrink_to_fit();
        self.ends.shrink_to_fit();
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
/// Eight bytes at a time, each step a multiplication of which both halves count: numbered names differ in few
/// bits, and those must reach all bits of the hash.
fn hash(text: &[u8]) -> u64 {
    const FOLD: u64 = 0x2020_2020_2020_2020;
    let (eights, rest) = text.as_chunks::<8>();
    let mut hash = text.len() as u64;
    for &eight in eights {
        hash = mix(hash ^ (u64::from_le_bytes(eight) | FOLD));
    }
    let mut last = [0; 8];
    for (to, from) in last.iter_mut().zip(rest) {
        *to = *from;
    }
    mix(hash ^ (u64::from_le_bytes(last) | FOLD))
}

fn mix(word: u64) -> u64 {
    let product = u128::from(word ^ 0x9E37_79B9_7F4A_7C15) * 0xD6E8_FEB8_6659_FD93;
    (product as u64) ^ (product >> 64) as u64
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
