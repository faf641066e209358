//! The nearest of several words, for findings that propose what was meant.

/// The candidate with the smallest edit distance to `word` (swapping neighbours counts once), if it is near
/// enough to have been meant: at most a third of the letters differ. Case does not matter; the first wins a tie.
pub fn nearest<'c>(word: &str, candidates: impl IntoIterator<Item = &'c str>) -> Option<&'c str> {
    let word: Vec<char> = word.chars().take(64).map(|c| c.to_ascii_lowercase()).collect();
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let other: Vec<char> = candidate.chars().take(64).map(|c| c.to_ascii_lowercase()).collect();
        let limit = word.len().max(other.len()).div_ceil(3);
        if word.len().abs_diff(other.len()) > limit {
            continue;
        }
        let distance = distance(&word, &other);
        if distance <= limit && distance < word.len() && best.is_none_or(|(d, _)| distance < d) {
            best = Some((distance, candidate));
        }
    }
    best.map(|(_, candidate)| candidate)
}

/// Optimal string alignment distance (Damerau–Levenshtein, each part edited once).
fn distance(a: &[char], b: &[char]) -> usize {
    let mut rows = vec![vec![0; b.len() + 1]; a.len() + 1];
    for (i, row) in rows.iter_mut().enumerate() {
        row[0] = i;
    }
    for (j, cell) in rows[0].iter_mut().enumerate() {
        *cell = j;
    }
    for i in 1..=a.len() {
        for j in 1..=b.len() {
            let change = rows[i - 1][j - 1] + usize::from(a[i - 1] != b[j - 1]);
            let mut least = change.min(rows[i - 1][j] + 1).min(rows[i][j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                least = least.min(rows[i - 2][j - 2] + 1);
            }
            rows[i][j] = least;
        }
    }
    rows[a.len()][b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_words_are_found_and_far_ones_are_not() {
        assert_eq!(nearest("modle", ["model", "subckt"]), Some("model"));
        assert_eq!(nearest("SUBCKTS", ["model", "subckt"]), Some("subckt"));
        assert_eq!(nearest("banana", ["model", "subckt"]), None);
        assert_eq!(nearest("a", ["b"]), None);
    }
}
