//! Names one letter apart. Digits and signs count as system (n1 n2, a[3] a[4], in+ in-), never as slips.

use rustc_hash::FxHashMap;
use std::hash::Hash;

/// A suspect name and the known name one slip away from it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Similar {
    /// Index of the suspect.
    pub suspect: usize,
    /// Index of the known name.
    pub known: usize,
}

/// For each suspect the known names of its own place that are one slip away: a letter changed, missing, added,
/// or two neighbours exchanged. Names are folded to one case by the caller. Linear in the length of all names,
/// since only names with a letter struck out are compared, by hash; at most `MOST` for each suspect.
pub fn similar<'a, Place: Copy + Eq + Hash>(
    suspects: impl Iterator<Item = (usize, Place, &'a str)>,
    known: impl Iterator<Item = (usize, Place, &'a str)>,
) -> Vec<Similar> {
    let mut struck: FxHashMap<(Place, String), Vec<usize>> = FxHashMap::default();
    let mut names = FxHashMap::default();
    for (index, place, name) in suspects {
        names.insert(index, (name, 0usize));
        for form in forms(name) {
            struck.entry((place, form)).or_default().push(index);
        }
    }
    let mut found = Vec::new();
    if names.is_empty() {
        return found;
    }
    for (index, place, name) in known {
        for form in forms(name) {
            for &suspect in struck.get(&(place, form)).into_iter().flatten() {
                let Some((other, count)) = names.get_mut(&suspect) else { continue };
                if *count < MOST && suspect != index && is_slip(other, name) {
                    *count += 1;
                    found.push(Similar { suspect, known: index });
                }
            }
        }
    }
    found.sort();
    found.dedup();
    found
}

/// More than this and the names are a system, not slips.
const MOST: usize = 64;
/// Shorter names differ by one letter too easily.
const SHORTEST: usize = 3;

/// The name itself and the name with each one of its letters struck out.
fn forms(name: &str) -> Vec<String> {
    let letters: Vec<char> = name.chars().collect();
    if letters.len() < SHORTEST {
        return Vec::new();
    }
    let mut forms = vec![name.to_owned()];
    for (at, letter) in letters.iter().enumerate() {
        if letter.is_alphabetic() {
            forms.push(letters.iter().enumerate().filter(|(n, _)| *n != at).map(|(_, c)| *c).collect());
        }
    }
    forms
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
