//! Typed numbers of the circuit's parts, and the interner of names.

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
    /// Those that are looked up.
    known: Spellings,
    /// Those that are not; their numbers have the highest bit set.
    appended: Spellings,
    /// Spellings that are not the first of their name, with the first.
    variants: FxHashMap<u32, u32>,
    /// Open addressing with steps of one; its length is a power of two, or zero.
    table: Vec<Spelling>,
    /// Places of the table that are taken.
    taken: usize,
}

impl PartialEq for Names {
    fn eq(&self, other: &Self) -> bool {
        self.known == other.known && self.appended == other.appended
    }
}

/// Spellings one behind the other.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
struct Spellings {
    bytes: String,
    ends: Vec<u32>,
}

impl Spellings {
    fn push(&mut self, text: &str) -> u32 {
        let id = u32::try_from(self.ends.len()).unwrap_or(u32::MAX);
        self.bytes.push_str(text);
        self.ends.push(u32::try_from(self.bytes.len()).unwrap_or(u32::MAX));
        id
    }

    fn text(&self, id: u32) -> &str {
        let id = id as usize;
        let start = if id == 0 { 0 } else { self.ends.get(id - 1).map_or(0, |&e| e as usize) };
        let end = self.ends.get(id).map_or(start, |&e| e as usize);
        self.bytes.get(start..end).unwrap_or("")
    }

    fn shrink(&mut self) {
        self.bytes.shrink_to_fit();
        self.ends.shrink_to_fit();
    }
}

/// The bit that tells numbers of appended spellings.
const APPENDED: u32 = 1 << 31;

/// A spelling in the table: its number, the hash of its name and where its bytes stand, so that most look-ups
/// go to the table and to the bytes and nowhere else.
#[derive(Debug, Clone, Copy)]
struct Spelling {
    hash: u32,
    id: u32,
    start: u32,
    length: u32,
}

/// A place of the table that nothing has taken.
const FREE: Spelling = Spelling { hash: 0, id: u32::MAX, start: 0, length: 0 };
/// So many spellings of one name are told apart; all others count as the first. Else a name of twenty letters,
/// written a million ways, would be compared with a million others each time.
const MOST_VARIANTS: usize = 16;

impl Spelling {
    fn text(self, bytes: &[u8]) -> &[u8] {
        let start = self.start as usize;
        bytes.get(start..start + self.length as usize).unwrap_or_default()
    }
}

impl Names {
    /// Makes room for so many spellings that are looked up, and so many that are appended.
    pub fn reserve(&mut self, known: usize, appended: usize) {
        for (spellings, count) in [(&mut self.known, known), (&mut self.appended, appended)] {
            spellings.bytes.reserve(count.saturating_mul(7));
            spellings.ends.reserve(count);
        }
        self.grow(known);
    }

    /// Makes room in the table for so many spellings, a third of it free.
    fn grow(&mut self, count: usize) {
        let length = count.saturating_mul(3).div_ceil(2).next_power_of_two().max(16);
        if length <= self.table.len() {
            return;
        }
        let old = std::mem::replace(&mut self.table, vec![FREE; length]);
        for spelling in old.into_iter().filter(|s| s.id != FREE.id) {
            let at = self.free_from(spelling.hash);
            self.table[at] = spelling;
        }
    }

    fn free_from(&self, hash: u32) -> usize {
        let mask = self.table.len() - 1;
        let mut at = hash as usize & mask;
        while self.table[at].id != FREE.id {
            at = (at + 1) & mask;
        }
        at
    }

    /// The spellings from the place of a hash on, up to the first free place.
    fn from(&self, hash: u32) -> impl Iterator<Item = Spelling> + '_ {
        let mask = self.table.len().wrapping_sub(1);
        let first = hash as usize & mask;
        let places = (0..self.table.len()).map_while(move |n| self.table.get((first + n) & mask).copied());
        places.take_while(|s| s.id != FREE.id)
    }

    /// The number of a spelling, new or known.
    pub fn intern(&mut self, text: &str) -> Symbol {
        let hash = Names::hash(text);
        let (mut first, mut variants) = (None, 0);
        for spelling in self.from(hash).filter(|s| s.hash == hash) {
            let known = spelling.text(self.known.bytes.as_bytes());
            if known == text.as_bytes() {
                return Symbol(spelling.id);
            }
            if known.eq_ignore_ascii_case(text.as_bytes()) {
                first.get_or_insert(spelling.id);
                variants += 1;
            }
        }
        match first {
            Some(first) if variants >= MOST_VARIANTS => self.fold(Symbol(first)),
            _ => self.insert(text, hash, first),
        }
    }

    fn insert(&mut self, text: &str, hash: u32, first: Option<u32>) -> Symbol {
        self.taken += 1;
        self.grow(self.taken);
        let start = u32::try_from(self.known.bytes.len()).unwrap_or(u32::MAX);
        let id = Symbol(self.known.push(text));
        if let Some(first) = first {
            let first = self.fold(Symbol(first));
            self.variants.insert(id.0, first.0);
        }
        let length = u32::try_from(text.len()).unwrap_or(u32::MAX);
        let at = self.free_from(hash);
        self.table[at] = Spelling { hash, id: id.0, start, length };
        id
    }

    /// A number for a spelling that is not to be looked up here, with its case-blind hash: the names of elements,
    /// nearly all of which are new, would only make the table too large for the caches.
    pub fn append(&mut self, text: &str) -> (Symbol, u32) {
        (Symbol(self.appended.push(text) | APPENDED), Names::hash(text))
    }

    /// The number that most likely has a hash, and the first byte of its name: for bringing both, and what belongs to
    /// the number, into the caches before they are wanted. Many independent looks take little longer than one.
    pub fn glance(&self, hash: u32) -> (Symbol, u8) {
        let mask = self.table.len().wrapping_sub(1);
        let likely = self.table.get(hash as usize & mask).copied().unwrap_or(FREE);
        (Symbol(likely.id), self.known.bytes.as_bytes().get(likely.start as usize).copied().unwrap_or(0))
    }

    /// The number of a name already known in any case, as [`Names::fold`] gives it.
    pub fn find(&self, text: &str) -> Option<Symbol> {
        let hash = Names::hash(text);
        let same = |s: &Spelling| {
            s.hash == hash && s.text(self.known.bytes.as_bytes()).eq_ignore_ascii_case(text.as_bytes())
        };
        let found = self.from(hash).find(same)?;
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
        self.table = Vec::new();
        self.taken = 0;
        self.known.shrink();
        self.appended.shrink();
    }

    /// The spelling; empty for a number that is not ours.
    pub fn text(&self, symbol: Symbol) -> &str {
        if symbol.0 & APPENDED == 0 {
            self.known.text(symbol.0)
        } else {
            self.appended.text(symbol.0 & !APPENDED)
        }
    }

    /// A hash that is blind to the case of ASCII letters. Eight bytes at a time, each step a multiplication of which
    /// both halves count: numbered names differ in few bits, and those must reach all bits of the hash.
    pub fn hash(text: &str) -> u32 {
        let (eights, rest) = text.as_bytes().as_chunks::<8>();
        let mut hash = text.len() as u64;
        for &eight in eights {
            hash = mix(hash ^ lower(u64::from_le_bytes(eight)));
        }
        let mut last = [0; 8];
        for (to, from) in last.iter_mut().zip(rest) {
            *to = *from;
        }
        let hash = mix(hash ^ lower(u64::from_le_bytes(last)));
        (hash ^ (hash >> 32)) as u32
    }
}

/// Eight bytes with their ASCII letters in lower case.
fn lower(eight: u64) -> u64 {
    const ONES: u64 = 0x0101_0101_0101_0101;
    let low = eight & (0x7F * ONES);
    let from_a = low + (0x80 - b'A' as u64) * ONES;
    let past_z = low + (0x7F - b'Z' as u64) * ONES;
    let capitals = !eight & (from_a ^ past_z) & (0x80 * ONES);
    eight | (capitals >> 2)
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

    #[test]
    fn many_names_are_told_apart() {
        let mut names = Names::default();
        let ids: Vec<_> = (0..5000).map(|n| names.intern(&format!("node_[{n}]^"))).collect();
        for (n, &id) in ids.iter().enumerate() {
            assert_eq!(names.find(&format!("NODE_[{n}]^")), Some(id));
            assert_eq!(names.find(&format!("node_{{{n}]^")), None);
        }
    }

    #[test]
    fn a_name_written_in_very_many_ways_is_one_name() {
        let mut names = Names::default();
        let spelling = |n: u32| {
            let one = |bit: u32| if n >> bit & 1 == 1 { 'A' } else { 'a' };
            (0..12).map(one).collect::<String>()
        };
        let ids: Vec<_> = (0..4096).map(|n| names.intern(&spelling(n))).collect();
        assert!(ids.iter().all(|&id| names.fold(id) == ids[0]));
        assert!(names.known.ends.len() <= 2 * MOST_VARIANTS, "{}", names.known.ends.len());
    }
}
