//! Names one letter apart. Digits and signs count as system (n1 n2, a[3] a[4], in+ in-), never as slips.

use rustc_hash::FxHashMap;

/// A suspect name and the known name one slip away from it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Similar {
    /// Index of the suspect.
    pub suspect: usize,
    /// Index of the known name.
    pub known: usize,
}

/// A suspect while its likes are looked for.
struct Suspect<Place> {
    index: usize,
    place: Place,
    folded: String,
    found: usize,
}

/// For each suspect the known names of its own place that are one slip away: a letter changed, missing, added,
/// or two neighbours exchanged. Case does not matter. Linear in the length of all names, since only names with a
/// letter struck out are compared, by hash; at most `MOST` for each suspect.
pub fn similar<'a, Place: Copy + Eq>(
    suspects: impl Iterator<Item = (usize, Place, &'a str)>,
    known: impl Iterator<Item = (usize, Place, &'a str)>,
) -> Vec<Similar> {
    let mut forms = Forms::default();
    let mut struck: FxHashMap<u64, Vec<usize>> = FxHashMap::default();
    // nearly all forms of nearly all names are in nobody's list: one bit tells
    let mut marks = vec![0u64; 1 << 14];
    let mut names: Vec<Suspect<Place>> = Vec::new();
    for (index, place, name) in suspects {
        for &form in forms.of(name) {
            struck.entry(form).or_default().push(names.len());
            marks[mark(form).0] |= mark(form).1;
        }
        names.push(Suspect { index, place, folded: forms.folded.clone(), found: 0 });
    }
    let mut pairs = Vec::new();
    if names.is_empty() {
        return pairs;
    }
    for (index, place, name) in known {
        forms.of(name);
        for form in forms.hashes.iter().filter(|form| marks[mark(**form).0] & mark(**form).1 != 0) {
            for &number in struck.get(form).into_iter().flatten() {
                let Some(suspect) = names.get_mut(number).filter(|s| s.place == place) else { continue };
                if suspect.found < MOST && suspect.index != index && is_slip(&suspect.folded, &forms.folded) {
                    suspect.found += 1;
                    pairs.push(Similar { suspect: suspect.index, known: index });
                }
            }
        }
    }
    pairs.sort();
    pairs.dedup();
    pairs
}

/// The word and the bit of a hash's mark.
fn mark(form: u64) -> (usize, u64) {
    ((form >> 50) as usize, 1 << (form >> 44 & 63))
}

/// More than this and the names are a system, not slips.
const MOST: usize = 64;
/// Shorter names differ by one letter too easily.
const SHORTEST: usize = 3;

/// Hashes of a name and of the name with each one of its letters struck out; its buffers are used again.
#[derive(Default)]
struct Forms {
    folded: String,
    letters: Vec<char>,
    /// Of the letters from each on: their hash, and the factor that moves what stands before them past them.
    tails: Vec<(u64, u64)>,
    hashes: Vec<u64>,
}

impl Forms {
    fn of(&mut self, name: &str) -> &[u64] {
        const FACTOR: u64 = 0xD6E8_FEB8_6659_FD93;
        let Forms { folded, letters, tails, hashes } = self;
        folded.clear();
        folded.extend(name.chars().flat_map(char::to_lowercase));
        letters.clear();
        letters.extend(folded.chars());
        hashes.clear();
        if letters.len() < SHORTEST {
            return hashes;
        }
        tails.clear();
        tails.push((0, 1));
        let (mut tail, mut factor) = (0u64, 1u64);
        for &letter in letters.iter().rev() {
            tail = tail.wrapping_add(u64::from(letter).wrapping_mul(factor));
            factor = factor.wrapping_mul(FACTOR);
            tails.push((tail, factor));
        }
        let mut head = 0u64;
        for (&letter, &(tail, factor)) in letters.iter().zip(tails.iter().rev().skip(1)) {
            if letter.is_alphabetic() {
                hashes.push(spread(head.wrapping_mul(factor).wrapping_add(tail)));
            }
            head = head.wrapping_mul(FACTOR).wrapping_add(u64::from(letter));
        }
        hashes.push(spread(head));
        hashes
    }
}

/// The low bits of a sum of products reach its high bits.
fn spread(hash: u64) -> u64 {
    (hash ^ hash >> 32).wrapping_mul(0x9E37_79B9_7F4A_7C15)
}

/// Whether one slip of a letter leads from one name to the other.
pub fn is_slip(a: &str, b: &str) -> bool {
    let (a, b): (Vec<char>, Vec<char>) = (a.chars().collect(), b.chars().collect());
    let (short, long) = if a.len() <= b.len() { (&a, &b) } else { (&b, &a) };
    if short.len() + 1 < SHORTEST || long.len() < SHORTEST || short == long {
        return false;
    }
    let start = short.iter().zip(long).take_while(|(x, y)| x == y).count();
    let room = short.len() - start;
    let end = short.iter().rev().zip(long.iter().rev()).take(room).take_while(|(x, y)| x == y).count();
    match (&short[start..short.len() - end], &long[start..long.len() - end]) {
        ([], [extra]) => extra.is_alphabetic(),
        ([x], [y]) => x.is_alphabetic() && y.is_alphabetic(),
        ([x, y], [p, q]) => x == q && y == p && x.is_alphabetic() && y.is_alphabetic(),
        _ => false,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slips_are_one_letter_apart() {
        for (a, b) in [("bat_in", "bta_in"), ("output", "ouput"), ("sense", "sensse"), ("vbat", "vbot")] {
            assert!(is_slip(a, b) && is_slip(b, a), "{a} {b}");
        }
        for (a, b) in [("n12", "n13"), ("a[3]", "a[4]"), ("in+", "in-"), ("n1", "n11"), ("vbat", "vbat")] {
            assert!(!is_slip(a, b), "{a} {b}");
        }
        assert!(!is_slip("va", "vb"));
    }

    #[test]
    fn only_names_of_one_place_are_compared() {
        let known = [(0, 7, "battery"), (1, 8, "battery"), (2, 7, "lamp")];
        let found = similar([(9, 7, "batery")].into_iter(), known.into_iter());
        assert_eq!(found, [Similar { suspect: 9, known: 0 }]);
    }
}
