//! Whether a title line reads as an element that was lost by standing on line 1.

use crate::syntax::{self, Fields, TokenKind};

/// The element's name, if the line is a complete element: its letter, its nodes, and a value or model.
pub(super) fn reads_as_element(text: &str) -> Option<&str> {
    let mut fields = Fields::default();
    fields.read(text, 0, u32::try_from(text.len()).ok()?).ok()?;
    let words: Vec<&str> =
        fields.words.iter().map(|t| text.get(t.start as usize..t.end as usize).unwrap_or("")).collect();
    let name = *words.first()?;
    let mut letters = name.chars();
    let letter = letters.next()?.to_ascii_uppercase();
    let is_numbered = letters.next().is_some_and(|c| c.is_ascii_digit());
    let is_value = |n: usize| {
        words.get(n).is_some_and(|w| syntax::number(w.as_bytes()).is_some())
            || fields.words.get(n).is_some_and(|t| t.kind == TokenKind::Expression)
    };
    let has_shape = |n: usize| {
        ["dc", "ac", "sin", "pulse", "pwl", "exp", "sffm"]
            .iter()
            .any(|s| words.get(n).is_some_and(|w| w.eq_ignore_ascii_case(s)))
    };
    let count = words.len();
    let reads = match letter {
        'R' | 'C' | 'L' => is_value(3) && (is_numbered || count == 4),
        'V' | 'I' => (is_value(3) || has_shape(3)) && (is_numbered || count == 4),
        'D' => is_numbered && count == 4,
        'Q' | 'J' => is_numbered && matches!(count, 5 | 6),
        'M' => is_numbered && count == 6,
        'E' | 'G' => is_numbered && count == 6 && is_value(5),
        'F' | 'H' => is_numbered && count == 5 && is_value(4),
        _ => false,
    };
    reads.then_some(name)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn elements_are_told_from_prose() {
        for text in ["R1 a b 1k", "VIN in 0 5", "V1 in 0 SIN(0 5 50)", "D1 a b 1N4148", "Q1 c b e BC547"] {
            assert!(reads_as_element(text).is_some(), "{text}");
        }
        for text in [
            "Rectifier with 2 diodes",
            "RC filter, 1 kHz",
            "Voltage divider 5",
            "D1 and D2 in series",
            "",
            "Q1 is bad",
        ] {
            assert!(reads_as_element(text).is_none(), "{text}");
        }
    }
}
