//! The nearest of several words, for findings that propose what was meant.

/// The candidate with the smallest edit distance to `word` (optimal string alignment: swapping neighbours counts
/// once), if it is near enough to have been meant: at most a third of the letters differ. Case does not matter; the
/// first wins a tie.
pub fn nearest<'c>(word: &str, candidates: impl IntoIterator<Item = &'c str>) -> Option<&'c str> {
    // longer words are no slips of one another, and the distance takes the product of their lengths
    let folded = |text: &str| text.chars().take(64).map(|c| c.to_ascii_lowercase()).collect::<String>();
    let word = folded(word);
    let letters = word.chars().count();
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let other = folded(candidate);
        let count = other.chars().count();
        let limit = letters.max(count).div_ceil(3);
        if letters.abs_diff(count) > limit {
            continue;
        }
        let distance = strsim::osa_distance(&word, &other);
        if distance <= limit && distance < letters && best.is_none_or(|(d, _)| distance < d) {
            best = Some((distance, candidate));
        }
    }
    best.map(|(_, candidate)| candidate)
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
