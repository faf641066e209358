//! `.subckt` and `.ends`: definitions that open and close, nested as they stand.

use super::line::Line;
use super::parsed::Block;
use super::read::Reader;
use crate::finding::{Finding, Severity};
use crate::text::Span;

impl Reader<'_> {
    /// `subckt-line = ".subckt" name *port ["params:"] *pair`
    pub(super) fn subckt_line(&mut self, line: &Line<'_>) {
        let parent = self.open.last().copied().unwrap_or(0);
        let name = line.word(1).map_or(line.head(), |t| line.at(t));
        let number = self.parsed.blocks.len();
        let mut block = Block::new(name, line.span, parent);
        block.ports =
            (2..line.fields.words_before_pairs).filter_map(|n| line.word(n)).map(|t| line.at(t)).collect();
        block.defaults = super::dot::settings(line);
        self.parsed.blocks.push(block);
        self.open.push(number);
        if line.len() < 2 {
            return self.tell_nameless(line);
        }
        let key = line.word_str(1).to_ascii_lowercase();
        let parent = self.parsed.blocks.get_mut(parent);
        if let Some(first) = parent.and_then(|b| b.subcircuits.insert(key, number)) {
            let first = self.parsed.blocks.get(first).map(|b| (b.name_span, b.statement));
            self.tell_definition_twice(name, first);
        }
    }

    fn tell_definition_twice(&mut self, name: Span, first: Option<(Span, Span)>) {
        let Some((first, _)) = first else { return };
        if first.file != name.file && self.sources.name(first.file) == self.sources.name(name.file) {
            // one library included twice says the same twice
            return;
        }
        self.tell_twice("subcircuit", name, name, Some((first, Span { end: first.start, ..first })));
    }

    fn tell_nameless(&mut self, line: &Line<'_>) {
        let finding =
            Finding::new("unreadable-line", Severity::Error, line.span, "this .subckt line has no name")
                .label("no name")
                .help("Write it as `.subckt NAME PORTS…`; what it holds cannot be used until it has one.");
        self.tell(finding);
    }

    /// `ends-line = ".ends" [name]`
    pub(super) fn ends_line(&mut self, line: &Line<'_>) {
        let name = line.word(1).map(|t| line.str(t));
        let depth = match name {
            None => self.open.len().checked_sub(1).filter(|&d| d > 0),
            Some(name) => (1..self.open.len()).rev().find(|&d| self.is_named(self.open[d], name)),
        };
        match depth {
            Some(depth) => {
                self.unclosed(depth + 1);
                self.open.truncate(depth);
            }
            None if self.open.len() > 1 => {
                self.tell_other_name(line);
                self.open.pop();
            }
            None => {
                let finding = Finding::new(
                    "stray-ends",
                    Severity::Warning,
                    line.span,
                    "this line ends a subcircuit, and none is open",
                )
                .label("ends nothing")
                .help("Remove it, or put the .subckt line back that belongs to it.");
                self.tell(finding);
            }
        }
    }

    fn is_named(&self, block: usize, name: &str) -> bool {
        self.parsed
            .blocks
            .get(block)
            .is_some_and(|b| self.sources.slice(b.name_span).eq_ignore_ascii_case(name))
    }

    fn tell_other_name(&mut self, line: &Line<'_>) {
        let open = self.open.last().and_then(|&b| self.parsed.blocks.get(b)).map(|b| b.name_span);
        let Some(open) = open else { return };
        let (given, wanted) = (line.word_str(1), self.sources.slice(open));
        let finding = Finding::new(
            "stray-ends",
            Severity::Warning,
            line.span,
            format!("this line ends {given}, and {wanted} is open"),
        )
        .label(format!("taken as the end of {wanted}"))
        .also(open, "opened here")
        .about(given)
        .help("Correct one of the two names.");
        self.tell(finding);
    }

    /// Tells and closes the definitions from depth `from` on.
    pub(super) fn unclosed(&mut self, from: usize) {
        for block in self.open.split_off(from.min(self.open.len())) {
            let Some((name, statement)) = self.parsed.blocks.get(block).map(|b| (b.name_span, b.statement))
            else {
                continue;
            };
            self.parsed.incomplete = true;
            let text = self.sources.slice(name);
            let finding = Finding::new(
                "unclosed-subcircuit",
                Severity::Error,
                statement,
                format!("the subcircuit {text} has no .ends line"),
            )
            .label("opened here and never closed")
            .about(text)
            .help("Everything behind it counts as its inside; put its .ends line where it should end.");
            self.tell(finding);
        }
    }
}
