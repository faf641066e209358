//! Whether a title line reads as an element that was lost by standing on line 1.

use crate::syntax::{self, Fields, TokenKind};

/// The element's name, if the line is a complete element: its letter, its nodes, and a value or model. Where the name
/// has no number it may be prose (`Charger board rev 2`), so the `rest` of the file has to touch one of its nodes.
pub(super) fn reads_as_element<'t>(text: &'t str, rest: &str) -> Option<&'t str> {
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
    let nodes = words.get(1..3).unwrap_or_default();
    let is_wired = |r: &str| nodes.iter().any(|node| *node != "0" && is_touched(node, r));
    let reads = match letter {
        'R' | 'C' | 'L' => is_value(3) && (is_numbered || (count == 4 && is_wired(rest))),
        'V' | 'I' => (is_value(3) || has_shape(3)) && (is_numbered || (count == 4 && is_wired(rest))),
        'D' => is_numbered && count == 4,
        'Q' | 'J' => is_numbered && matches!(count, 5 | 6),
        'M' => is_numbered && count == 6,
        'E' | 'G' => is_numbered && count == 6 && is_value(5),
        'F' | 'H' => is_numbered && count == 5 && is_value(4),
        _ => false,
    };
    reads.then_some(name)
}

/// Whether an element of the `rest` has this node: a word of a line that is neither comment nor dot line.
fn is_touched(node: &str, rest: &str) -> bool {
    let lines = rest.lines().filter(|line| !line.trim_start().starts_with(['*', '.', ';', '$']));
    lines.flat_map(|line| line.split_whitespace().skip(1).take(4)).any(|word| word.eq_ignore_ascii_case(node))
}

/// The word of a title that reads as a dot line which defines or includes something.
pub(super) fn reads_as_dot_line(text: &str) -> Option<&str> {
    let word = text.split_whitespace().next()?;
    let known = [".model", ".subckt", ".param", ".include", ".inc", ".lib", ".global", ".macro"];
    (known.iter().any(|k| word.eq_ignore_ascii_case(k)) && text.split_whitespace().count() > 1)
        .then_some(word)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn elements_are_told_from_prose() {
        let rest = "* for board and divider\nR9 in out 1k\n.end\n";
        for text in ["R1 a b 1k", "VIN in 0 5", "V1 in 0 SIN(0 5 50)", "D1 a b 1N4148", "Q1 c b e BC547"] {
            assert!(reads_as_element(text, rest).is_some(), "{text}");
        }
        assert_eq!(reads_as_dot_line(".SUBCKT LAMP a k"), Some(".SUBCKT"));
        for text in [".title Charger", ".model", "Charger .model", "", ".end"] {
            assert!(reads_as_dot_line(text).is_none(), "{text}");
        }
        for text in [
            "Rectifier with 2 diodes",
            "RC filter, 1 kHz",
            "Voltage divider 5",
            "Charger board rev 2",
            "LED driver version 3",
            "D1 and D2 in series",
            "",
            "Q1 is bad",
        ] {
            assert!(reads_as_element(text, rest).is_none(), "{text}");
        }
    }
}
