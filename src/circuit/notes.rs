//! Notes of the text to notes of the circuit.

use super::behaviour::Value;
use super::expand::Expander;
use super::note::{Expectation, Hold, Note, NoteKind, State};
use crate::finding::{Edit, Finding, Severity};
use crate::syntax::{self, ExpectText, HoldWord, NoteProblem, NoteText, NoteWord};
use crate::text::Span;

impl Expander<'_> {
    /// Reads the note under `span` into the innermost instance.
    pub(super) fn note(&mut self, span: Span) {
        match syntax::note(self.sources.slice(span)) {
            Ok(text) => self.keep_note(span, text),
            Err(problem) => self.tell_note(span, problem),
        }
    }

    fn keep_note(&mut self, span: Span, text: NoteText<'_>) {
        let place = |w: NoteWord<'_>| {
            Span::new(span.file, span.start as usize + w.start, span.start as usize + w.start + w.text.len())
        };
        let written = |w: NoteWord<'_>, number: f64| Value { number, written: true, span: place(w) };
        let names = &mut self.circuit.names;
        let (subject, kind) = match text {
            NoteText::Drop(name, word, volts) => (name, NoteKind::Drop(written(word, volts))),
            NoteText::MadeOf(name, material) => (name, NoteKind::MadeOf(material.text.to_ascii_lowercase())),
            NoteText::Supply(name, word, volts, range) => {
                (name, NoteKind::Supply { volts: written(word, volts), range })
            }
            NoteText::Range(name, from, to) => (name, NoteKind::Range { from, to }),
            NoteText::Hold(name, how) => (name, NoteKind::Hold(hold(how))),
            NoteText::Expect(name, expected) => (name, NoteKind::Expect(expectation(&expected))),
            NoteText::Watch(name, other, ripple) => {
                let ripple = ripple.map(|(word, volts)| written(word, volts));
                (name, NoteKind::Watch { other: other.map(|w| names.intern(w.text)), ripple })
            }
            NoteText::Matched(name, others) => {
                (name, NoteKind::Matched(others.iter().map(|w| names.intern(w.text)).collect()))
            }
            NoteText::Rating(name, ratings) => (name, NoteKind::Rating(ratings)),
            NoteText::Accept(rule, subject, reason) => {
                let kind = NoteKind::Accept { rule: rule.text.to_owned(), reason };
                (subject.unwrap_or(NoteWord { start: rule.start + rule.text.len(), text: "" }), kind)
            }
        };
        let symbol = names.intern(subject.text);
        let scope = self.frame().scope;
        self.circuit.notes.push(Note { scope, span, subject: symbol, subject_span: place(subject), kind });
    }

    fn tell_note(&mut self, span: Span, problem: NoteProblem) {
        let at = Span::new(span.file, span.start as usize + problem.start, span.start as usize + problem.end);
        let mut finding = Finding::new("unreadable-note", Severity::Warning, at, problem.message)
            .label("not read")
            .about(self.sources.slice(at))
            .help("Notes say what the netlist cannot; this one has no effect until it can be read.");
        if let Some(nearest) = problem.nearest {
            finding.help = format!("Did you mean `{nearest}`? Until it is mended the note has no effect.");
            finding = finding
                .fix(format!("write `{nearest}`"), vec![Edit { span: at, replacement: nearest.to_owned() }]);
        }
        self.tell(finding);
    }
}

fn hold(word: HoldWord) -> Hold {
    match word {
        HoldWord::On => Hold::On,
        HoldWord::Off => Hold::Off,
        HoldWord::Both => Hold::Both,
    }
}

fn expectation(text: &ExpectText<'_>) -> Expectation {
    let state = text.state.map(|word| match word {
        "conducting" => State::Conducting,
        "blocking" => State::Blocking,
        _ => State::Breakdown,
    });
    Expectation {
        state,
        is_voltage: text.is_voltage,
        range: text.range.map(|(a, b)| (a.min(b), a.max(b))),
        at: text.at.map(str::to_owned),
        some: text.some,
        over_time: text.over_time,
    }
}
