//! Colour and clean text: the page that reports are written on, the few inks it knows, and the filter that
//! keeps control characters of the input off the terminal. Says nothing about what is written.

/// What a stretch of text means; the page turns it into colour, or into nothing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Ink {
    /// Cannot be right.
    Error,
    /// Very likely a mistake; open quantities.
    Warning,
    /// Worth knowing.
    Note,
    /// The sentence to read first.
    Strong,
    /// What may be skipped.
    Faint,
    /// Related places.
    Second,
    /// A diode that conducts, a verdict that holds.
    Live,
    /// A diode in breakdown.
    Reverse,
}

impl Ink {
    /// ANSI (ECMA-48) sequence that starts it.
    fn start(self) -> &'static str {
        match self {
            Ink::Error => "\x1b[1;31m",
            Ink::Warning => "\x1b[1;33m",
            Ink::Note => "\x1b[1;34m",
            Ink::Strong => "\x1b[1m",
            Ink::Faint => "\x1b[2m",
            Ink::Second => "\x1b[36m",
            Ink::Live => "\x1b[32m",
            Ink::Reverse => "\x1b[35m",
        }
    }
}

/// Text under way to a terminal or a file.
#[derive(Debug, Clone, Default)]
pub struct Page {
    text: String,
    colour: bool,
    /// Columns of the terminal, where it is one.
    columns: Option<usize>,
}

/// Running text is not broken narrower than this, however narrow the terminal.
const NARROWEST: usize = 36;

impl Page {
    /// An empty page, with colour or without.
    pub fn new(colour: bool) -> Self {
        Page { text: String::new(), colour, columns: None }
    }

    /// The same for a terminal of so many columns: running text is broken there at the latest.
    #[must_use]
    pub fn on_terminal(self, columns: Option<usize>) -> Self {
        Page { columns, ..self }
    }

    /// At which width running text is broken that would like to be as wide as `wanted`.
    pub(super) fn room(&self, wanted: usize) -> usize {
        // what is indented is narrower by its indent already, but for the two columns of a paragraph
        self.columns.map_or(wanted, |columns| wanted.min(columns.saturating_sub(2).max(NARROWEST)))
    }

    /// The text written so far.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Adds text as it is.
    pub fn plain(&mut self, text: &str) -> &mut Self {
        self.text.push_str(text);
        self
    }

    /// Adds text in an ink.
    pub(super) fn ink(&mut self, ink: Ink, text: &str) -> &mut Self {
        self.start(ink);
        self.text.push_str(text);
        self.stop();
        self
    }

    /// Ends the line.
    pub fn end(&mut self) -> &mut Self {
        self.text.push('\n');
        self
    }

    pub(super) fn start(&mut self, ink: Ink) {
        if self.colour {
            self.text.push_str(ink.start());
        }
    }

    pub(super) fn stop(&mut self) {
        if self.colour {
            self.text.push_str("\x1b[0m");
        }
    }
}

/// A character that may move the cursor, colour the screen or turn the reading direction.
fn unfit(c: char) -> bool {
    c.is_control() || matches!(c, '\u{200E}' | '\u{200F}' | '\u{2028}'..='\u{202E}' | '\u{2066}'..='\u{2069}')
}

/// The character to show: unfit ones become the replacement character, a tab one space.
pub(super) fn fit(c: char) -> char {
    match c {
        '\t' => ' ',
        c if unfit(c) => char::REPLACEMENT_CHARACTER,
        c => c,
    }
}

/// A word longer than this is cut: it is a mistake, or an attack on the reader's patience.
const LONGEST_WORD: usize = 120;
/// Characters kept of it.
const KEPT: usize = 60;

/// Text of the input made fit for a terminal, every character of it.
pub(super) fn whole(text: &str) -> String {
    text.chars().map(fit).collect()
}

/// Text of the input made fit for a terminal and for a reader.
pub(super) fn clean(text: &str) -> String {
    if text.len() <= LONGEST_WORD {
        return whole(text);
    }
    let mut out = String::new();
    for word in text.split_inclusive(char::is_whitespace) {
        if word.chars().nth(LONGEST_WORD).is_some() {
            out.extend(word.chars().take(KEPT).map(fit));
            out.push('…');
            out.extend(word.chars().last().filter(|c| c.is_whitespace()));
        } else {
            out.extend(word.chars().map(fit));
        }
    }
    out
}

/// Breaks text into lines of at most `width` columns, at spaces; a longer word stays whole, and so does what
/// stands between backquotes, since it may be copied.
pub(super) fn wrap(text: &str, width: usize) -> Vec<String> {
    let mut lines = Vec::new();
    for paragraph in text.lines() {
        let mut line = String::new();
        let paragraph = clean(paragraph);
        for word in words(&paragraph) {
            if !line.is_empty() && columns(&line) + 1 + columns(word) > width {
                lines.push(std::mem::take(&mut line));
            }
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
        lines.push(line);
    }
    lines
}

/// Words at spaces outside of backquotes; a number and its unit are one.
fn words(text: &str) -> Vec<&str> {
    let (mut words, mut start, mut quoted) = (Vec::new(), 0, false);
    for (at, c) in text.char_indices().chain([(text.len(), ' ')]) {
        quoted ^= c == '`';
        let word = text.get(start..at).unwrap_or("");
        let is_end = c.is_whitespace() && (!quoted || at == text.len());
        if is_end && !(word.ends_with(|c: char| c.is_ascii_digit()) && unit_follows(text, at)) {
            words.extend(Some(word.trim()).filter(|w| !w.is_empty()));
            start = at + c.len_utf8();
        }
    }
    words
}

/// Whether a unit with or without a prefix stands behind the space at `at`.
fn unit_follows(text: &str, at: usize) -> bool {
    let next = text.get(at..).and_then(|rest| rest.split_whitespace().next()).unwrap_or("");
    let unit = next.trim_end_matches(['.', ',', ';', ':', ')']);
    let base = unit.strip_prefix(['f', 'p', 'n', 'µ', 'm', 'k', 'M', 'G', 'T']).unwrap_or(unit);
    ["V", "A", "Ω", "W", "F", "H", "J", "s", "°C", "Hz"].iter().any(|&u| u == base || u == unit)
}

/// Columns that a text takes on a terminal.
pub(super) fn columns(text: &str) -> usize {
    unicode_width::UnicodeWidthStr::width(text)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn control_characters_never_reach_the_page() {
        assert_eq!(clean("R1\x1b[31m\u{202E}\ta"), "R1\u{FFFD}[31m\u{FFFD} a");
    }

    #[test]
    fn endless_words_are_cut() {
        let text = format!("a {} b", "x".repeat(9999));
        assert_eq!(clean(&text), format!("a {}… b", "x".repeat(KEPT)));
    }

    #[test]
    fn lines_break_at_spaces() {
        assert_eq!(wrap("one two three", 8), ["one two", "three"]);
        assert_eq!(wrap("unbreakable", 3), ["unbreakable"]);
        assert_eq!(wrap("it is 420 mA, or 1 V", 8), ["it is", "420 mA,", "or 1 V"]);
        assert_eq!(wrap("write `*@ watch out`, then", 14), ["write", "`*@ watch out`,", "then"]);
    }

    #[test]
    fn colour_only_where_asked_for() {
        let mut page = Page::new(false);
        page.ink(Ink::Error, "x");
        assert_eq!(page.text(), "x");
    }
}
