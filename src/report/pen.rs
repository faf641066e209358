//! Takes what codespan-reporting writes about marked lines and puts it on our page, in our inks and without the
//! headline that it would write itself.

use super::paint::{Ink, Page};
use codespan_reporting::diagnostic::{self, LabelStyle};
use codespan_reporting::term::WriteStyle;
use std::io;

/// Everything under the headline stands in from the margin by this much.
pub(super) const INDENT: &str = "  ";

/// The library opens with its own headline, the place and an empty border line; ours stand there already.
const HEADER_LINES: usize = 3;

/// Takes what codespan-reporting writes and puts it on the page, indented, in our inks.
pub(super) struct Pen<'a> {
    page: &'a mut Page,
    /// The line under way; with `None` for "back to plain" and `Some` for an ink.
    line: Vec<Stroke>,
    to_drop: usize,
}

enum Stroke {
    Text(String),
    Ink(Option<Ink>),
}

impl<'a> Pen<'a> {
    pub(super) fn new(page: &'a mut Page) -> Self {
        Pen { page, line: Vec::new(), to_drop: HEADER_LINES }
    }

    fn finish_line(&mut self) {
        let line = std::mem::take(&mut self.line);
        if self.to_drop > 0 {
            self.to_drop -= 1;
            return;
        }
        // the library ends with an empty line
        if !line.iter().any(|s| matches!(s, Stroke::Text(t) if !t.trim().is_empty())) {
            return;
        }
        self.page.plain(INDENT);
        for stroke in line {
            match stroke {
                Stroke::Text(text) => _ = self.page.plain(&text),
                Stroke::Ink(Some(ink)) => self.page.start(ink),
                Stroke::Ink(None) => self.page.stop(),
            }
        }
        self.page.end();
    }

    fn set(&mut self, ink: Option<Ink>) -> io::Result<()> {
        self.line.push(Stroke::Ink(ink));
        Ok(())
    }
}

impl io::Write for Pen<'_> {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        // formatting hands over whole strings
        let text = String::from_utf8_lossy(bytes);
        for (n, piece) in text.split('\n').enumerate() {
            if n > 0 {
                self.finish_line();
            }
            self.line.push(Stroke::Text(piece.to_owned()));
        }
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl WriteStyle for Pen<'_> {
    fn set_header(&mut self, _: diagnostic::Severity) -> io::Result<()> {
        Ok(())
    }
    fn set_header_message(&mut self) -> io::Result<()> {
        Ok(())
    }
    fn set_line_number(&mut self) -> io::Result<()> {
        self.set(Some(Ink::Faint))
    }
    fn set_note_bullet(&mut self) -> io::Result<()> {
        Ok(())
    }
    fn set_source_border(&mut self) -> io::Result<()> {
        self.set(Some(Ink::Faint))
    }
    fn set_label(&mut self, severity: diagnostic::Severity, style: LabelStyle) -> io::Result<()> {
        self.set(Some(match (style, severity) {
            (LabelStyle::Secondary, _) => Ink::Second,
            (_, diagnostic::Severity::Error) => Ink::Error,
            (_, diagnostic::Severity::Warning) => Ink::Warning,
            _ => Ink::Note,
        }))
    }
    fn reset(&mut self) -> io::Result<()> {
        self.set(None)
    }
}
