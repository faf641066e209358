//! Elements whose letter means nothing here, and parts that bear the letter of another: kept on their nodes, so that
//! no false alarm is raised about these, and told once for each letter.

use super::behaviour::Behaviour;
use super::expand::Expander;
use super::line::Line;
use super::semiconductor::shortened;
use crate::finding::{Finding, Severity, count};
use crate::syntax;
use crate::text::Span;
use std::collections::BTreeMap;

/// So many names at most in one finding.
const MOST_SUBJECTS: usize = 1000;

impl Expander<'_> {
    /// `unknown-element = name 1*node word`: its letter means nothing here.
    pub(super) fn unknown_element(&mut self, line: &Line<'_>, letter: u8) {
        let name = line.word_str(0);
        // the letter is a byte; what is shown is the whole character
        let first = name.chars().next().map_or(' ', |c| c.to_ascii_uppercase());
        let end = line.fields.words_before_pairs.min(line.len());
        let nodes_end = if end > 3 { end - 1 } else { end };
        let in_root = self.frames.len() <= 1;
        let is_part = in_root
            && letter.is_ascii_alphabetic()
            && end > 2
            && name.ends_with(|c: char| c.is_ascii_digit());
        let full_name = self.here(name);
        if is_part {
            self.unknown_parts.push((first, full_name, line.head()));
        } else {
            self.tell_unknown_letter(line.head(), full_name, first);
        }
        let first_pin = self.circuit.pins.len();
        if letter.is_ascii_alphabetic() && end > 2 {
            self.push_pins(line, 1, nodes_end);
            self.push_element(
                line,
                letter,
                first_pin,
                Behaviour::Unknown { reason: "a letter not known here" },
            );
        }
        self.circuit.incomplete = true;
    }

    fn tell_unknown_letter(&mut self, place: Span, name: String, first: char) {
        let message = format!("{name} begins with {first}, which stands for no element known here");
        let finding = Finding::new("unknown-element", Severity::Warning, place, message)
            .label("kept as an unknown element on its nodes")
            .about(name)
            .help("If it is prose, begin the line with *; if it is an element, no statement is made about what it does.");
        self.tell(finding);
    }

    /// One finding for all parts that bear the letter of a junction transistor and are none.
    pub(super) fn tell_connectors(&mut self) {
        let Some(mut finding) = self.connectors.take() else { return };
        if let more @ 1.. = finding.subjects.len() - 1 {
            finding.message.push_str(&format!(", and so are {more} more"));
        }
        finding.subjects.truncate(MOST_SUBJECTS);
        self.tell(finding);
    }

    /// Parts of letters that mean nothing here, such as a board's `U1` and `U2`: one finding for each letter.
    pub(super) fn tell_unknown_parts(&mut self) {
        let mut by_letter: BTreeMap<char, Vec<(String, Span)>> = BTreeMap::new();
        for (letter, name, place) in std::mem::take(&mut self.unknown_parts) {
            let parts = by_letter.entry(letter).or_default();
            // the same line in many instances is one
            if parts.last().is_none_or(|(_, last)| *last != place) {
                parts.push((name, place));
            }
        }
        for (letter, parts) in by_letter {
            let [(name, place), others @ ..] = parts.as_slice() else { continue };
            if others.is_empty() {
                self.tell_unknown_letter(*place, name.clone(), letter);
                continue;
            }
            let names: Vec<&str> = parts.iter().map(|part| part.0.as_str()).collect();
            let message =
                format!("{} begin with {letter}, which stands for no element known here", shortened(&names));
            let mut finding = Finding::new("unknown-element", Severity::Warning, *place, message)
                .label("kept as an unknown element on its nodes")
                .help("Nothing is said about what they do, and the nodes they touch are left in peace.");
            finding.subjects = names.iter().take(MOST_SUBJECTS).map(|&name| name.to_owned()).collect();
            for (_, place) in others.iter().take(7) {
                finding = finding.also(*place, "and this one");
            }
            self.tell(finding);
        }
    }

    /// Whether a J line is no transistor: it does not have three nodes and then a model.
    pub(super) fn is_connector(&self, line: &Line<'_>) -> bool {
        let words = line.fields.words_before_pairs.min(line.len());
        let is_area = |n: usize| line.is(n, "off") || syntax::number(line.word_str(n).as_bytes()).is_some();
        words >= 4 && words != 5 && !self.knows_model(line.word_str(4)) && !(5..words).all(is_area)
            || words == 4
    }

    /// Other parts bear the letter of a junction transistor too: a name, nodes, a type.
    pub(super) fn connector(&mut self, line: &Line<'_>) {
        self.circuit.incomplete = true;
        let name = line.word_str(0);
        let last = line.fields.words_before_pairs.min(line.len()) - 1;
        let nodes = count(last - 1, "node");
        let kind = line.word_str(last);
        let full_name = self.here(name);
        if let Some(first) = &mut self.connectors {
            // one finding for all of a board's connectors
            first.subjects.push(full_name);
        } else {
            let message = format!(
                "{name} has {nodes} and then {kind}: a junction transistor has 3 and then its model, so this is another part"
            );
            let finding = Finding::new("unknown-element", Severity::Note, line.head(), message)
                .label("kept as an unknown element on its nodes")
                .about(full_name)
                .help("If it is a connector, nothing is wrong; if it is a transistor, give its drain, gate, source and model.");
            self.connectors = Some(finding);
        }
        let first_pin = self.circuit.pins.len();
        self.push_pins(line, 1, last);
        self.push_element(
            line,
            b'J',
            first_pin,
            Behaviour::Unknown { reason: "a part that is no transistor" },
        );
    }
}
