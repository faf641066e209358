//! Instances of subcircuits, expanded in place, with their limits.

use super::behaviour::Behaviour;
use super::expand::{Expander, Frame};
use super::ids::{NodeId, ScopeId, Symbol};
use super::line::Line;
use super::parameter::{Evaluation, Parameter, Worth, declare};
use super::{Pin, Scope};
use crate::finding::{Finding, Severity, count};
use crate::syntax::Pair;
use crate::text::{Span, nearest};
use rustc_hash::FxHashMap;

/// Names among which the one that was meant is looked for.
const MOST_CANDIDATES: usize = 2000;
/// Instances within instances.
const DEEPEST: usize = 64;
/// Elements, instances and notes together, after expansion; fewer in tests, which must be quick.
pub(super) const MOST_PARTS: usize = if cfg!(test) { 30_000 } else { 3_000_000 };

impl Expander<'_> {
    /// `instance = name *node subcircuit ["params:"] *pair`
    pub(super) fn instance(&mut self, line: &Line<'_>, broken: bool) {
        let first_pin = self.circuit.pins.len();
        let end = line.fields.words_before_pairs.min(line.len());
        let wanted = end.saturating_sub(1);
        self.push_pins(line, 1, wanted.max(1));
        if wanted == 0 {
            return self.tell_bare_instance(line);
        }
        self.note_instance(line);
        let name = line.word_str(wanted);
        let block = self.frames.last().map_or(0, |f| f.block);
        let found = self.parsed.find_subcircuit(block, &name.to_ascii_lowercase());
        let Some(definition) = found.filter(|_| !broken) else {
            if found.is_none() {
                let span = line.word(wanted).map_or(line.span, |t| line.at(t));
                self.missing_subcircuits.push((span, self.circuit.elements.len()));
            }
            return self.opaque(line, first_pin, "its subcircuit is missing");
        };
        if let Some(reason) = self.obstacle(line, definition, first_pin) {
            return self.opaque(line, first_pin, reason);
        }
        let is_root = self.frames.len() <= 1;
        if is_root {
            self.resolve_pins();
        }
        let pins = self.circuit.pins.split_off(first_pin);
        self.expand_instance(line, definition, &pins);
        if is_root {
            // those inside the instance know their nodes
            self.resolved = self.circuit.pins.len();
        }
    }

    /// Keeps an instance whose inside is not known.
    fn opaque(&mut self, line: &Line<'_>, first_pin: usize, reason: &'static str) {
        self.circuit.incomplete = true;
        self.push_element(line, b'X', first_pin, Behaviour::Unknown { reason });
    }

    fn tell_bare_instance(&mut self, line: &Line<'_>) {
        self.circuit.incomplete = true;
        let name = line.word_str(0);
        let finding = Finding::new(
            "unreadable-line",
            Severity::Error,
            line.span,
            format!("{name} names no subcircuit"),
        )
        .label("no subcircuit")
        .about(name)
        .help("Write its nodes and then the name of the subcircuit.");
        self.tell(finding);
    }

    /// Two instances of one name are two things of one name.
    fn note_instance(&mut self, line: &Line<'_>) {
        let symbol = self.circuit.names.intern(line.word_str(0));
        let folded = self.circuit.names.fold(symbol);
        let place = line.head();
        let first = *self.frame().instances.entry(folded).or_insert(place);
        if first != place {
            let name = line.word_str(0);
            let finding = Finding::new(
                "duplicate-name",
                Severity::Error,
                place,
                format!("{name} is the name of two instances"),
            )
            .label("the second of that name")
            .also(first, "the first of that name")
            .about(name)
            .help("Rename one of them: other tools refuse the file or drop one of the two without a word.");
            self.tell(finding);
        }
    }

    /// Why an instance cannot be expanded; told.
    fn obstacle(&mut self, line: &Line<'_>, definition: usize, first_pin: usize) -> Option<&'static str> {
        let parsed = self.parsed;
        let block = &parsed.blocks[definition];
        let name = self.sources.slice(block.name_span);
        let given = self.circuit.pins.len() - first_pin;
        if self.frames.iter().any(|f| f.block == definition) {
            let finding = Finding::new(
                "recursive-subcircuit",
                Severity::Error,
                line.span,
                format!("the subcircuit {name} holds an instance of itself"),
            )
            .label("would be expanded without end")
            .also(block.statement, "defined here")
            .about(name)
            .help("Remove the instance; it counts as an unknown element on its nodes.");
            self.tell(finding);
            return Some("a subcircuit that holds itself");
        }
        if given != block.ports.len() {
            let ports = block.ports.len();
            let (nodes, has) = (count(given, "node"), count(ports, "port"));
            let finding = Finding::new("port-count", Severity::Error, line.span, format!("{} gives {nodes} to {name}, which has {has}", line.word_str(0)))
                .label(nodes)
                .also(block.statement, has)
                .about(self.here(line.word_str(0)))
                .help("Give one node for each port, in the order of the definition; until then it counts as an unknown element on its nodes.");
            self.tell(finding);
            return Some("an instance with the wrong number of nodes");
        }
        self.parts += 1;
        let too_many = self.parts + self.circuit.elements.len() > MOST_PARTS;
        if too_many || self.frames.len() > DEEPEST {
            self.tell_limit(
                line.span,
                if too_many { TOO_MANY } else { "instances stand within instances more than 64 deep" },
            );
            return Some("an expansion that is too large");
        }
        None
    }

    /// Tells once that the expansion has stopped.
    pub(super) fn tell_limit(&mut self, span: Span, what: &str) {
        if std::mem::replace(&mut self.stopped, true) {
            return;
        }
        let finding = Finding::new(
            "limit-reached",
            Severity::Error,
            span,
            format!("the expansion stops here: {what}"),
        )
        .label("not expanded")
        .help("What is beyond counts as unknown elements on their nodes; check the subcircuits one by one.");
        self.tell(finding);
    }

    fn expand_instance(&mut self, line: &Line<'_>, definition: usize, pins: &[Pin]) {
        let parsed = self.parsed;
        let block = &parsed.blocks[definition];
        let scope = ScopeId::new(self.circuit.scopes.len());
        let parent = self.frame().scope;
        let names = &mut self.circuit.names;
        let name = names.intern(line.word_str(0));
        let subcircuit = names.intern(self.sources.slice(block.name_span));
        self.circuit.scopes.push(Scope {
            parent: Some(parent),
            name,
            call: line.span,
            subcircuit,
            definition: block.statement,
        });
        let mut frame =
            Frame { scope, block: definition, nodes: self.ports(&block.ports, pins), ..Frame::default() };
        let own = self.frames.len();
        declare(&mut frame.parameters, &block.defaults, own);
        declare(&mut frame.parameters, &block.parameters, own);
        for pair in &line.fields.pairs {
            self.override_parameter(line, pair, &mut frame, own);
        }
        frame.copies = self.copies() * self.copies_of(line, &frame);
        self.frames.push(frame);
        self.used_blocks[definition] = true;
        self.body(definition);
        self.finish_frame();
    }

    /// `m=…` on an instance's line, unless its subcircuit has a parameter of that name and so its own use for it.
    fn copies_of(&mut self, line: &Line<'_>, frame: &Frame<'_>) -> f64 {
        let Some(token) = line.pair("m").filter(|_| !frame.parameters.table.contains_key("m")) else {
            return 1.0;
        };
        let worth = self.worth(line.at(token));
        self.judge_slip(line.word_str(0), worth);
        match worth {
            Worth::Is(value) if value.number > 0.0 => return value.number,
            Worth::Told => return 1.0,
            _ => {}
        }
        let (name, text) = (line.word_str(0), line.str(token));
        let message =
            format!("{name} is to stand for {text} instances in parallel, which is no number above zero");
        let finding = Finding::new("unreadable-line", Severity::Error, line.at(token), message)
            .label("read as 1")
            .about(self.here(name))
            .help("Write how many there are, or take m= out.");
        self.tell(finding);
        1.0
    }

    fn ports(&mut self, ports: &[Span], pins: &[Pin]) -> FxHashMap<Symbol, NodeId> {
        let mut nodes = FxHashMap::default();
        for (&port, pin) in ports.iter().zip(pins) {
            let symbol = self.circuit.names.intern(self.sources.slice(port));
            nodes.insert(self.circuit.names.fold(symbol), pin.node);
        }
        nodes
    }

    /// `name=value` on the instance's line: seen from the instance that holds the line.
    fn override_parameter(&mut self, line: &Line<'_>, pair: &Pair, frame: &mut Frame<'_>, own: usize) {
        let key = line.str(pair.key).to_ascii_lowercase();
        let table = &mut frame.parameters.table;
        if let Some(parameter) = table.get_mut(key.as_str()) {
            *parameter = Parameter {
                value: line.at(pair.value),
                frame: own.saturating_sub(1),
                state: Evaluation::Waiting,
            };
            return;
        }
        if key == "m" {
            return;
        }
        let mut known: Vec<&str> = table.keys().copied().collect();
        known.sort_unstable();
        let subcircuit = self.sources.slice(self.parsed.blocks[frame.block].name_span);
        let help = match nearest(&key, known.iter().copied()) {
            Some(near) => format!("Did you mean `{near}`? As it stands it has no effect."),
            None if known.is_empty() => {
                "It has no effect; remove it, or give the subcircuit that parameter.".to_owned()
            }
            None => format!("It has no effect; the parameters are {}.", known.join(", ")),
        };
        let finding = Finding::new(
            "unknown-subcircuit-parameter",
            Severity::Warning,
            line.at(pair.key),
            format!("{subcircuit} has no parameter {key}"),
        )
        .label("no such parameter")
        .also(self.parsed.blocks[frame.block].statement, "defined here")
        .about(self.here(line.word_str(0)))
        .help(help);
        self.tell(finding);
    }

    /// One finding for each subcircuit that is named and not defined.
    pub(super) fn tell_missing_subcircuits(&mut self) {
        let missing = std::mem::take(&mut self.missing_subcircuits);
        if self.parsed.include_missing {
            return;
        }
        let mut by_name: Vec<(String, Span, usize)> = Vec::new();
        let mut index: FxHashMap<String, usize> = FxHashMap::default();
        for (span, _) in missing {
            let name = self.sources.slice(span).to_ascii_lowercase();
            let at = *index.entry(name.clone()).or_insert(by_name.len());
            match by_name.get_mut(at) {
                Some(known) => known.2 += 1,
                None => by_name.push((name, span, 1)),
            }
        }
        let mut known: Vec<&str> = self.parsed.blocks[0].subcircuits.keys().map(String::as_str).collect();
        known.sort_unstable();
        known.truncate(MOST_CANDIDATES);
        for (name, span, count) in by_name {
            let text = self.sources.slice(span);
            let more = if count > 1 { format!(", named by {count} instances,") } else { String::new() };
            let is_full = self.told.is_full("missing-subcircuit");
            let near = if is_full { None } else { nearest(&name, known.iter().copied()) };
            let help = near.map_or_else(
                || "Add its definition or include the file that holds it; until then".to_owned(),
                |near| format!("Did you mean `{near}`? Until it is defined"),
            );
            let finding = Finding::new(
                "missing-subcircuit",
                Severity::Error,
                span,
                format!("the subcircuit {text}{more} is not defined"),
            )
            .label("not defined")
            .about(text)
            .help(format!("{help} its instances count as unknown elements on their nodes."));
            self.tell(finding);
        }
    }
}

pub(super) const TOO_MANY: &str = "more than 3,000,000 elements and instances";
