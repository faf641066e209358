//! Words on an element's line that nothing has read: most often the next line's, whose line end is missing, or those of
//! a continuation whose own first line was commented out.

use super::behaviour::Behaviour;
use super::expand::Expander;
use super::line::Line;
use crate::finding::{Edit, Finding, Severity};
use crate::syntax::{self, Behind, TokenKind};
use crate::text::Span;

impl Expander<'_> {
    /// Tells the words behind all that an element of this letter reads; its value or model is word `rest`.
    pub(super) fn tell_surplus(&mut self, line: &Line<'_>, letter: u8, rest: usize, behaviour: &Behaviour) {
        if line.len() <= rest + 1 || matches!(behaviour, Behaviour::Unknown { .. }) {
            return;
        }
        let first = match letter {
            b'R' | b'C' | b'L' => self.behind_passive(line, rest),
            b'D' | b'Q' | b'M' | b'J' => behind_numbers(line, rest + 1),
            b'S' => behind_state(line, rest + 1),
            b'W' => behind_state(line, rest + 2),
            b'E' | b'G' if rest == 5 => rest + 1,
            b'F' | b'H' if !line.is(rest, "poly") => rest + 2,
            // the sources tell their own, and the rest may hold anything
            _ => return,
        };
        // a tolerance says nothing that is asked here
        let is_tolerance = |n: &usize| {
            line.word_str(*n).strip_suffix('%').is_some_and(|t| syntax::number(t.as_bytes()).is_some())
        };
        if let Some(first) = (first..line.len()).find(|n| !is_tolerance(n)) {
            self.tell_surplus_from(line, first);
        }
    }

    /// Behind a value with its model before it, or behind a value and then a model.
    fn behind_passive(&self, line: &Line<'_>, rest: usize) -> usize {
        let is_value = |n: usize| {
            line.word(n).is_some_and(|t| {
                t.kind != TokenKind::Word
                    || syntax::number(line.str(t).as_bytes()).is_some()
                    || self.is_parameter(line.str(t))
            })
        };
        if line.fields.decimal_comma(line.text, rest).is_some() {
            return rest + 2;
        }
        let keyed = line.fields.words_before_pairs <= rest;
        match (is_value(rest), is_value(rest + 1)) {
            _ if keyed => rest,
            (true, false) if self.knows_model(line.word_str(rest + 1)) => rest + 2,
            (false, true) => rest + 2,
            _ => rest + 1,
        }
    }

    /// Tells the words from number `first` on, unless the first of them is a unit that stands apart from its value.
    pub(super) fn tell_surplus_from(&mut self, line: &Line<'_>, first: usize) {
        match apart(line, first) {
            Some(Apart::Scale(meant)) => self.tell_apart(line, first, &meant),
            Some(Apart::Unit) if first + 1 < line.len() => self.tell_words(line, first + 1),
            Some(Apart::Unit) => {}
            None => self.tell_words(line, first),
        }
    }

    /// A scale letter that a blank parts from its value, as in `4.7 k`.
    fn tell_apart(&mut self, line: &Line<'_>, first: usize, meant: &str) {
        let (Some(value), Some(scale)) = (line.word(first - 1), line.word(first)) else { return };
        let (name, digits, letter) = (line.word_str(0), line.str(value), line.str(scale));
        let span = line.at(value).to(line.at(scale));
        let message = format!(
            "the {letter} behind the {digits} of {name} stands apart from it, so the value is read as {digits}"
        );
        let finding = Finding::new("misread-value", Severity::Warning, span, message)
            .label(format!("read as {digits}"))
            .about(self.here(name))
            .help(format!("Write `{meant}` if that is what was meant."))
            .fix(format!("write `{meant}`"), vec![Edit { span, replacement: meant.to_owned() }]);
        self.tell(finding);
    }

    fn tell_words(&mut self, line: &Line<'_>, first: usize) {
        let (Some(from), Some(last)) = (line.word(first), line.word(line.len().saturating_sub(1))) else {
            return;
        };
        let before = line.word(first.saturating_sub(1)).map_or(from.start, |t| t.end);
        let continued =
            line.text.get(before as usize..from.start as usize).is_some_and(|gap| gap.contains('\n'));
        let is_number = |n: usize| syntax::number(line.word_str(n).as_bytes()).is_some();
        let only_numbers = (first..line.len()).all(is_number);
        let name = line.word_str(0);
        let words: Vec<&str> = (first..line.len()).map(|n| line.word_str(n)).collect();
        let shown = super::semiconductor::shortened(&words);
        let verb = if words.len() == 1 { "means" } else { "mean" };
        let span: Span = if from.end <= last.end { line.at(from).to(line.at(last)) } else { line.at(from) };
        // coefficients are sometimes written behind a value; on a line of its own nothing should be
        let severity = if only_numbers && !continued { Severity::Note } else { Severity::Warning };
        let help = if continued {
            "A line beginning with + continues the last statement above it that is no comment; put * before it too, or \
             mend the line it belongs to."
        } else {
            "If they begin another statement, its line end is missing; if they are a comment, put ; before them."
        };
        let finding = Finding::new(
            "surplus-word",
            severity,
            span,
            format!("{shown} on the line of {name} {verb} nothing there: the element is complete without"),
        )
        .label("not read")
        .about(self.here(name))
        .help(help);
        self.tell(finding);
    }
}

/// What stands behind a value with a blank between.
enum Apart {
    /// A scale letter; the value as it was meant.
    Scale(String),
    /// A unit.
    Unit,
}

/// Whether word `first` is a scale letter or a unit of the plain number before it, on the same line of text.
fn apart(line: &Line<'_>, first: usize) -> Option<Apart> {
    let (value, word) = (line.word(first.checked_sub(1)?)?, line.word(first)?);
    let (digits, tail) = (line.str(value), line.str(word));
    let is_near =
        line.text.get(value.end as usize..word.start as usize)?.bytes().all(|b| matches!(b, b' ' | b'\t'));
    let begins = tail.starts_with(|c: char| c.is_alphabetic() || matches!(c, '%' | '\u{b0}'));
    let plain = syntax::number(digits.as_bytes()).filter(|n| n.length() == digits.len() && n.suffix == 0)?;
    let whole = format!("{digits}{tail}");
    let joined =
        syntax::number(whole.as_bytes()).filter(|n| is_near && begins && n.digits == plain.digits)?;
    match (syntax::behind(&whole, joined), joined.suffix) {
        (Behind::Unit(_), 0) => Some(Apart::Unit),
        (Behind::Nothing | Behind::Unit(_), 1..) if !joined.letter_code => Some(Apart::Scale(whole)),
        _ => None,
    }
}

/// Behind a model: its area and other numbers, and `off`.
fn behind_numbers(line: &Line<'_>, from: usize) -> usize {
    let is_read = |n: &usize| {
        line.word(*n).is_some_and(|t| {
            t.kind != TokenKind::Word
                || syntax::number(line.str(t).as_bytes()).is_some()
                || line.is(*n, "off")
        })
    };
    (from..line.len()).find(|n| !is_read(n)).unwrap_or(line.len())
}

/// Behind a switch's model: `on` or `off`.
fn behind_state(line: &Line<'_>, from: usize) -> usize {
    from + usize::from(line.is(from, "on") || line.is(from, "off"))
}
