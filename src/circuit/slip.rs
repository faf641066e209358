//! Letters behind a value that cannot belong there: ignored as a unit would be, and told.

use super::behaviour::Value;
use super::expand::Expander;
use super::parameter::Worth;
use crate::finding::{Edit, Finding, Severity, quantity};
use crate::syntax::{self, Behind, Unit};
use crate::text::Span;

impl Expander<'_> {
    /// Tells a slip in a number that is no part's value: a parameter's, a model's, a shape's. `whose` is empty where the
    /// number belongs to nothing that has a name.
    pub(super) fn judge_slip(&mut self, whose: &str, worth: Worth) {
        if let Worth::Is(Value { written: true, span, .. }) = worth {
            self.judge_number(whose, span);
        }
    }

    /// The same of a number anywhere, as in an expression.
    pub(super) fn judge_number(&mut self, whose: &str, span: Span) {
        let text = self.sources().slice(span);
        if text.as_bytes().last().is_none_or(u8::is_ascii_digit) {
            return;
        }
        let Some(number) = syntax::number(text.as_bytes()) else { return };
        let suffix = text.get(number.digits..number.digits + number.suffix);
        let read = quantity(number.value, "");
        match syntax::behind(text, number) {
            // nobody writes the thousandth of a hertz so
            Behind::Unit(Unit::Hertz) if suffix == Some("M") && !number.letter_code => {
                let meant = format!("{}Meg", text.get(..number.digits).unwrap_or(text));
                let why = "the M means milli, whatever its case";
                self.tell_slip(whose, span, (&format!("{}Hz", read.trim_end()), why), Some(meant));
            }
            behind if behind.is_slip() => self.tell_behind(whose, span, read.trim_end(), behind),
            _ => {}
        }
    }

    /// Tells what stands behind a value and is neither nothing nor a unit. `read` is the value as it is read.
    pub(super) fn tell_behind(&mut self, whose: &str, span: Span, read: &str, behind: Behind<'_>) {
        match behind {
            Behind::Nothing | Behind::Unit(_) => {}
            Behind::Digit(meant) => {
                let text = self.sources().slice(span);
                let letters = text.chars().zip(meant.chars()).filter(|(a, b)| a != b).count();
                let why = match letters {
                    1 => "a letter in it looks like a digit, and letters behind a value are ignored",
                    _ => "letters in it look like digits, and letters behind a value are ignored",
                };
                self.tell_slip(whose, span, (read, why), Some(meant));
            }
            Behind::Scale(scale) => {
                let why = format!("a value has one scale letter, and {scale} behind it is ignored");
                self.tell_slip(whose, span, (read, &why), None);
            }
            Behind::Other(rest) => {
                let text = self.sources().slice(span);
                let message =
                    format!("{} is read as {read}: {rest} is no unit, and is ignored", of(text, whose));
                let finding = Finding::new("misread-value", Severity::Note, span, message)
                    .label(format!("read as {read}"))
                    .about(self.subject(whose, text))
                    .help("Take it out, or put it behind a ; as a comment.");
                self.tell(finding);
            }
        }
    }

    fn tell_slip(&mut self, whose: &str, span: Span, (read, why): (&str, &str), meant: Option<String>) {
        let text = self.sources().slice(span);
        let message = format!("{} is read as {read}: {why}", of(text, whose));
        let mut finding = Finding::new("misread-value", Severity::Warning, span, message)
            .label(format!("read as {read}"))
            .about(self.subject(whose, text))
            .help("Write the value as it is meant, with one scale letter and one unit at most.");
        if let Some(meant) = meant {
            finding.help = format!("Write `{meant}` if that is what was meant.");
            let edit = Edit { span, replacement: meant.clone() };
            finding = finding.fix(format!("write `{meant}`"), vec![edit]);
        }
        self.tell(finding);
    }

    fn subject(&self, whose: &str, text: &str) -> String {
        if whose.is_empty() { text.to_owned() } else { self.here(whose) }
    }
}

fn of(text: &str, whose: &str) -> String {
    if whose.is_empty() { text.to_owned() } else { format!("the {text} of {whose}") }
}
