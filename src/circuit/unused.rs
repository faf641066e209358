//! What is defined and never used: models, subcircuits, parameters, ports. Only the root file is looked at (a
//! library holds more than one circuit needs), and only what no line so much as mentions is told.

use super::expand::Expander;
use super::line::Line;
use super::parsed::Block;
use super::semiconductor::shortened;
use crate::finding::{Finding, Severity};
use crate::syntax::Fields;
use crate::text::{FileId, Span};
use rustc_hash::FxHashMap;

const ROOT_FILE: FileId = FileId(0);

/// Names that may be unused, by what they are, with the places of their definitions.
#[derive(Default)]
struct Candidates<'a> {
    models: Vec<(&'a str, Span)>,
    subcircuits: Vec<(&'a str, Span)>,
    parameters: Vec<(&'a str, Span)>,
}

impl<'a> Expander<'a> {
    /// Looks for what is never used, when all is expanded.
    pub(super) fn tell_unused(&mut self) {
        if self.circuit.elements.is_empty() {
            return self.tell_no_elements();
        }
        // what is missing may be what uses them
        if self.circuit.incomplete || self.stopped {
            return;
        }
        let candidates = self.candidates();
        let all = [&candidates.models, &candidates.subcircuits, &candidates.parameters];
        let mentions = self.mentions(all.into_iter().flatten().map(|c| c.0));
        let unused = |list: Vec<(&'a str, Span)>| -> Vec<(&'a str, Span)> {
            let few = |name: &str| mentions.get(&name.to_ascii_lowercase()).is_none_or(|&count| count <= 1);
            list.into_iter().filter(|(name, _)| few(name)).collect()
        };
        self.tell_list("unused-model", "model", unused(candidates.models));
        self.tell_list("unused-subcircuit", "subcircuit", unused(candidates.subcircuits));
        self.tell_list("unused-parameter", "parameter", unused(candidates.parameters));
        self.tell_unconnected_ports();
    }

    fn candidates(&self) -> Candidates<'a> {
        let parsed = self.parsed;
        let slice = |span: Span| self.sources.slice(span);
        let in_root = |span: Span| span.file == ROOT_FILE;
        let used_models: rustc_hash::FxHashSet<usize> = self.model_ids.keys().map(|k| k.0).collect();
        let models = parsed
            .models
            .iter()
            .enumerate()
            .filter(|(n, m)| in_root(m.name_span) && !used_models.contains(n));
        let is_named = |b: &Block| b.name_span.start > b.statement.start;
        let unused_block =
            |(n, b): &(usize, &Block)| *n > 0 && in_root(b.name_span) && is_named(b) && !self.used_blocks[*n];
        let subcircuits = parsed.blocks.iter().enumerate().filter(unused_block);
        let used_block = |n: usize| n == 0 || self.used_blocks[n];
        let settings = parsed.blocks.iter().enumerate().filter(|(n, _)| used_block(*n));
        let settings =
            settings.flat_map(|(n, b)| b.defaults.iter().chain(&b.parameters).map(move |s| (n, s)));
        let parameters = settings
            .filter(|(n, s)| in_root(s.name_span) && !self.used_parameters.contains(&(*n, s.name.as_str())));
        Candidates {
            models: models.map(|(_, m)| (slice(m.name_span), m.name_span)).collect(),
            subcircuits: subcircuits.map(|(_, b)| (slice(b.name_span), b.name_span)).collect(),
            parameters: parameters.map(|(_, s)| (slice(s.name_span), s.name_span)).collect(),
        }
    }

    /// How often each of these names (any case) stands in the text, comments and `.ends` lines left out.
    fn mentions<'n>(&self, names: impl Iterator<Item = &'n str>) -> FxHashMap<String, usize> {
        let mut counts: FxHashMap<String, usize> = names.map(|n| (n.to_ascii_lowercase(), 0)).collect();
        if counts.is_empty() {
            return counts;
        }
        for (_, file) in self.sources.files() {
            for line in file.text.lines().map(str::trim_start).filter(|l| !l.starts_with('*') && !is_ends(l))
            {
                for word in line.split(|c: char| c.is_whitespace() || "=,(){}'\";".contains(c)) {
                    count(&mut counts, word);
                    let parts = word.split(['+', '-', '*', '/', '?', ':', '<', '>', '!', '&', '|', '^', '%']);
                    parts.filter(|part| part.len() < word.len()).for_each(|part| count(&mut counts, part));
                }
            }
        }
        counts
    }

    fn tell_list(&mut self, rule: &'static str, what: &str, unused: Vec<(&str, Span)>) {
        let Some(&(_, span)) = unused.first() else { return };
        let names: Vec<&str> = unused.iter().map(|u| u.0).collect();
        let message = match names.as_slice() {
            [only] => format!("nothing uses the {what} {only}"),
            _ => format!("nothing uses {} of the {what}s defined here: {}", names.len(), shortened(&names)),
        };
        let mut finding = Finding::new(rule, Severity::Note, span, message)
            .label("defined and never used")
            .help("Remove it, or look whether what should use it is misspelt.");
        for &(_, place) in unused.iter().skip(1).take(7) {
            finding = finding.also(place, "nor this one");
        }
        for name in names {
            finding = finding.about(name);
        }
        self.tell(finding);
    }

    fn tell_no_elements(&mut self) {
        // where something could not be read, that has been told
        if self.circuit.incomplete {
            return;
        }
        let definitions = self.parsed.blocks.len() - 1;
        let models = self.parsed.models.len();
        let span = self.parsed.title.unwrap_or(Span::new(ROOT_FILE, 0, 0));
        let is_empty = self.sources.get(ROOT_FILE).is_none_or(|file| file.text.trim().is_empty());
        let message = if is_empty {
            "this file is empty, so there is nothing to check".to_owned()
        } else if definitions + models == 0 {
            "there are no elements in this file, so there is nothing to check".to_owned()
        } else {
            let counted = |count: usize, what: &str| match count {
                0 => None,
                1 => Some(format!("1 {what}")),
                _ => Some(format!("{count} {what}s")),
            };
            let parts = [counted(definitions, "subcircuit"), counted(models, "model")];
            let parts: Vec<String> = parts.into_iter().flatten().collect();
            format!("this file only defines {}, so there is nothing to check", parts.join(" and "))
        };
        let help = match definitions + models {
            0 => {
                "A netlist is a title line and then one element a line, such as `R1 in out 1k`; its first line is never an element."
            }
            _ => {
                "Check a circuit that uses what is defined here; the first line of a file is its title and never an element."
            }
        };
        let finding = Finding::new("nothing-to-check", Severity::Note, span, message)
            .label("no element behind this title")
            .help(help);
        self.tell(finding);
    }

    /// Ports that no line of their subcircuit touches.
    fn tell_unconnected_ports(&mut self) {
        let parsed = self.parsed;
        for (number, block) in parsed.blocks.iter().enumerate() {
            if number == 0 || !self.used_blocks[number] || block.statement.file != ROOT_FILE {
                continue;
            }
            let touched = self.words_inside(block);
            for &port in &block.ports {
                let name = self.sources.slice(port);
                if name != "0" && !touched.contains(&name.to_ascii_lowercase()) {
                    self.tell_unconnected(block, name, port);
                }
            }
        }
    }

    fn tell_unconnected(&mut self, block: &Block, name: &str, port: Span) {
        let subcircuit = self.sources.slice(block.name_span);
        let finding = Finding::new("unconnected-port", Severity::Note, port, format!("nothing inside {subcircuit} is joined to its port {name}"))
            .label("joined to nothing")
            .about(subcircuit)
            .help("An outside node that ends here is joined to nothing either; remove the port, or look whether a node inside is misspelt.");
        self.tell(finding);
    }

    fn words_inside(&self, block: &Block) -> rustc_hash::FxHashSet<String> {
        let mut words = rustc_hash::FxHashSet::default();
        let mut fields = Fields::default();
        let statements =
            block.body.iter().filter_map(|range| self.parsed.statements.get(range.clone())).flatten();
        for statement in statements.filter(|s| !s.is_note(self.sources)) {
            let (line, _) = Line::read(self.sources, statement.span, fields);
            words.extend(line.fields.words.iter().skip(1).map(|t| line.str(*t).to_ascii_lowercase()));
            fields = line.fields;
        }
        words
    }
}

fn count(counts: &mut FxHashMap<String, usize>, word: &str) {
    if word.is_empty() {
        return;
    }
    if let Some(count) = counts.get_mut(word) {
        *count += 1;
    } else if word.bytes().any(|b| b.is_ascii_uppercase())
        && let Some(count) = counts.get_mut(&word.to_ascii_lowercase())
    {
        *count += 1;
    }
}

fn is_ends(line: &str) -> bool {
    line.get(..5).is_some_and(|start| start.eq_ignore_ascii_case(".ends"))
}
