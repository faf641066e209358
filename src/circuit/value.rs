//! What a token is worth: numbers, expressions, parameters; and the traps that numbers set.

use super::behaviour::Value;
use super::expand::Expander;
use super::line::Line;
use crate::finding::{Edit, Finding, Severity, quantity};
use crate::syntax::{self, Token};
use crate::text::Span;

/// What kind of quantity a value is read for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Quantity {
    Ohms,
    Farads,
    Henries,
    Volts,
    Amperes,
    Plain,
}

impl Expander<'_> {
    /// The value of a token, judged for its traps; `None` where it has none (told already, or a word that is no
    /// value: then `Err` of its text).
    pub(super) fn value(&mut self, line: &Line<'_>, token: Token, quantity: Quantity) -> Option<Value> {
        let value = self.evaluate(line.at(token))?;
        self.judge(line.word_str(0), value, quantity);
        Some(value)
    }

    /// Warns where a written value is likely misread.
    fn judge(&mut self, name: &str, value: Value, quantity: Quantity) {
        if !value.written {
            return;
        }
        let text = self.sources().slice(value.span);
        let bytes = text.as_bytes();
        if !matches!(bytes.last(), Some(b'0'..=b'9' | b'M' | b'F')) || quantity == Quantity::Plain {
            return;
        }
        let Some(number) = syntax::number(bytes) else { return };
        let suffix = &text[number.digits..number.digits + number.suffix];
        match (suffix, quantity) {
            ("M", _) if number.letter_code => self.tell_mega_code(name, value, text),
            ("M", Quantity::Ohms) => {
                let meant = format!("{}Meg", &text[..number.digits]);
                self.tell_misread(name, value, "milli", &meant);
            }
            ("F", Quantity::Farads) if !number.letter_code => {
                let meant = text[..number.digits].to_owned();
                self.tell_misread(name, value, "femto", &meant);
            }
            _ => {}
        }
    }

    fn tell_misread(&mut self, name: &str, value: Value, scale: &str, meant: &str) {
        let text = self.sources().slice(value.span);
        let read = quantity(value.number, if scale == "milli" { "Ω" } else { "F" });
        let finding = Finding::new(
            "misread-value",
            Severity::Warning,
            value.span,
            format!("{name} is {read}: in {text} the last letter means {scale}, whatever its case"),
        )
        .label(format!("read as {read}"))
        .about(name)
        .help(format!("write {meant} if that is what was meant, or the value in another scale if it was not"))
        .fix(format!("write {meant}"), vec![Edit { span: value.span, replacement: meant.to_owned() }]);
        self.tell(finding);
    }

    fn tell_mega_code(&mut self, name: &str, value: Value, text: &str) {
        let finding = Finding::new(
            "mega-in-letter-code",
            Severity::Note,
            value.span,
            format!(
                "the {text} of {name} is read by the letter code of IEC 60062 as {:e}: between digits M is mega",
                value.number
            ),
        )
        .label(format!("read as {:e}", value.number))
        .about(name)
        .help("behind a number M means milli; write Meg to leave no doubt");
        self.tell(finding);
    }

    /// The value of the text under a span: a number, an expression, or the name of a parameter.
    pub(super) fn evaluate(&mut self, span: Span) -> Option<Value> {
        let text = self.sources().slice(span);
        let number = syntax::number(text.as_bytes())?;
        Some(Value { number: number.value, written: true, span })
    }
}
