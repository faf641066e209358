//! Blocks to the flat circuit: every instance expanded in place, every line's element made.

use super::ids::{ElementId, Names, NodeId, ScopeId, Symbol};
use super::line::Line;
use super::parsed::{Parsed, Statement};
use super::told::Told;
use super::{Behaviour, Circuit, Element, Node, Pin, Scope};
use crate::finding::{Finding, Severity};
use crate::syntax::{Fields, Token};
use crate::text::{Sources, Span};
use rustc_hash::{FxHashMap, FxHashSet};

/// Values that take the place of those in the text for one expansion.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Overrides {
    /// Root parameters by name.
    pub parameters: Vec<(String, f64)>,
    /// Degrees Celsius.
    pub temperature: Option<f64>,
}

/// An instance while its lines are read.
#[derive(Debug)]
pub(super) struct Frame<'a> {
    pub scope: ScopeId,
    pub block: usize,
    /// Nodes by folded name (instances only; the root has a table).
    pub nodes: FxHashMap<Symbol, NodeId>,
    /// Elements by folded name (instances only).
    pub elements: FxHashMap<Symbol, ElementId>,
    /// Elements that name other elements, resolved when all of the instance are known.
    pub late: Vec<(ElementId, Vec<Span>)>,
    /// Instances by folded name, with the place of the name.
    pub instances: FxHashMap<Symbol, Span>,
    pub parameters: super::parameter::Scope<'a>,
    /// So many copies of the instance lie in parallel.
    pub copies: f64,
}

impl Default for Frame<'_> {
    fn default() -> Self {
        Frame {
            scope: ScopeId::ROOT,
            block: 0,
            nodes: FxHashMap::default(),
            elements: FxHashMap::default(),
            late: Vec::new(),
            instances: FxHashMap::default(),
            parameters: super::parameter::Scope::default(),
            copies: 1.0,
        }
    }
}

/// The work in progress.
pub(crate) struct Expander<'a> {
    pub(super) sources: &'a Sources,
    pub(super) parsed: &'a Parsed,
    pub(super) overrides: &'a Overrides,
    pub(super) circuit: Circuit,
    pub(super) told: Told,
    pub(super) frames: Vec<Frame<'a>>,
    /// Expressions within expressions.
    pub(super) depth: usize,
    /// Bytes of function bodies that were evaluated.
    pub(super) of_functions: usize,
    /// Root nodes by folded name.
    root_nodes: Vec<NodeId>,
    /// Root elements with the hashes of their names; sorted when all are known.
    root_elements: Vec<(u32, ElementId)>,
    /// Pins before this one know their nodes.
    pub(super) resolved: usize,
    hashes: Vec<u32>,
    pub(super) globals: FxHashSet<Symbol>,
    pub(super) model_ids: FxHashMap<(usize, ScopeId), super::ModelId>,
    pub(super) undefined_models: Vec<(Span, ElementId)>,
    /// Where the missing name stands, and the number of the element.
    pub(super) missing_subcircuits: Vec<(Span, usize)>,
    /// Parts of unknown letters: the letter, the name, its place.
    pub(super) unknown_parts: Vec<(char, String, Span)>,
    /// The finding about connectors, if there is one.
    pub(super) connectors: Option<Finding>,
    /// Blocks that an instance was made of.
    pub(super) used_blocks: Vec<bool>,
    /// Parameters that were asked for, with the block that declares them.
    pub(super) used_parameters: FxHashSet<(usize, &'a str)>,
    /// Instances and notes so far.
    pub(super) parts: usize,
    /// A limit was reached.
    pub(super) stopped: bool,
}

const NONE: u32 = u32::MAX;
/// So many pins wait for their nodes.
const PINS_AT_ONCE: usize = 64;

/// Expands what was read, with other values where `overrides` gives them. Elements, nodes and their numbers are
/// the same for all overrides; only values differ.
pub fn expand(sources: &Sources, parsed: &Parsed, overrides: &Overrides) -> (Circuit, Vec<Finding>) {
    let mut expander = Expander {
        sources,
        parsed,
        overrides,
        circuit: Circuit { title: parsed.title, incomplete: parsed.incomplete, ..Circuit::default() },
        told: Told::default(),
        frames: Vec::new(),
        depth: 0,
        of_functions: 0,
        root_nodes: Vec::new(),
        root_elements: Vec::new(),
        resolved: 0,
        hashes: Vec::new(),
        globals: FxHashSet::default(),
        model_ids: FxHashMap::default(),
        undefined_models: Vec::new(),
        missing_subcircuits: Vec::new(),
        unknown_parts: Vec::new(),
        connectors: None,
        used_blocks: vec![false; parsed.blocks.len()],
        used_parameters: FxHashSet::default(),
        parts: 0,
        stopped: false,
    };
    expander.circuit.includes.clone_from(&parsed.includes);
    expander.root();
    let Expander { mut circuit, told, .. } = expander;
    circuit.names.seal();
    circuit.elements.shrink_to_fit();
    circuit.pins.shrink_to_fit();
    circuit.nodes.shrink_to_fit();
    let counts = told.counts();
    let mut findings = told.finish();
    super::told::tell_rest(&mut findings, &counts);
    (circuit, findings)
}

impl<'a> Expander<'a> {
    pub(super) fn sources(&self) -> &'a Sources {
        self.sources
    }

    /// A name with the path of the innermost instance before it.
    pub(super) fn here(&self, name: &str) -> String {
        let path = self.frames.iter().skip(1).filter_map(|f| self.circuit.scopes.get(f.scope.index()));
        path.map(|s| self.circuit.text(s.name)).chain([name]).collect::<Vec<_>>().join(":")
    }

    /// Tells a finding, with the way that leads to its place.
    pub(super) fn tell(&mut self, mut finding: Finding) {
        let scope = self.frames.last().map_or(ScopeId::ROOT, |f| f.scope);
        finding.trail = self.circuit.trail(scope, finding.span);
        self.told.tell(finding, scope != ScopeId::ROOT);
    }

    fn root(&mut self) {
        let count = self.parsed.statements.len();
        let names = &mut self.circuit.names;
        names.reserve(count / 2, count);
        let (zero, empty) = (names.intern("0"), names.intern(""));
        self.circuit.elements.reserve(count);
        self.circuit.pins.reserve(2 * count);
        self.root_elements.reserve(count);
        let nowhere = self.parsed.blocks[0].statement;
        self.circuit.nodes.push(Node { name: zero, scope: ScopeId::ROOT, first: nowhere });
        self.circuit.scopes.push(Scope {
            parent: None,
            name: empty,
            call: nowhere,
            subcircuit: empty,
            definition: nowhere,
        });
        let mut frame = Frame::default();
        super::parameter::declare(&mut frame.parameters, &self.parsed.blocks[0].parameters, 0);
        self.frames.push(frame);
        self.preset();
        for &span in &self.parsed.globals {
            let symbol = self.circuit.names.intern(self.sources.slice(span));
            self.globals.insert(self.circuit.names.fold(symbol));
        }
        self.settings();
        self.body(0);
        self.resolve_pins();
        self.sort_root_elements();
        self.finish_frame();
        self.tell_undefined_models();
        self.tell_missing_subcircuits();
        self.tell_unknown_parts();
        self.tell_connectors();
        self.tell_unused();
    }

    /// What is left to do when all lines of an instance are read; closes its frame.
    pub(super) fn finish_frame(&mut self) {
        self.late();
        self.initial_voltages();
        if let Some(frame) = self.frames.pop() {
            let asked = frame.parameters.table.iter().filter(|(_, p)| p.was_asked());
            self.used_parameters.extend(asked.map(|(name, _)| (frame.block, *name)));
        }
    }

    /// All statements of a block, into the innermost frame.
    pub(super) fn body(&mut self, block: usize) {
        let parsed = self.parsed;
        let mut fields = Fields::default();
        for range in &parsed.blocks[block].body {
            for statement in parsed.statements.get(range.clone()).unwrap_or_default() {
                if self.parts + self.circuit.elements.len() > super::instance::MOST_PARTS {
                    self.circuit.incomplete = true;
                    return self.tell_limit(statement.span, super::instance::TOO_MANY);
                }
                fields = self.statement(*statement, fields);
            }
        }
    }

    fn statement(&mut self, statement: Statement, fields: Fields) -> Fields {
        if statement.is_note(self.sources) {
            self.parts += 1;
            self.note(statement.span);
            return fields;
        }
        let (line, outcome) = Line::read(self.sources, statement.span, fields);
        if let Err(broken) = outcome {
            let span = Span { file: line.file(), start: broken.start, end: line.span.end };
            self.tell(
                Finding::new(
                    "unreadable-line",
                    Severity::Error,
                    span,
                    format!("{} cannot be read to its end: {}", line.word_str(0), broken.what),
                )
                .label(broken.what)
                .about(self.here(line.word_str(0)))
                .help("Close it on this statement; until then the element counts as unknown on its nodes."),
            );
        }
        self.element(&line, outcome.is_err());
        line.fields
    }

    pub(super) fn frame(&mut self) -> &mut Frame<'a> {
        if self.frames.is_empty() {
            self.frames.push(Frame::default());
        }
        let last = self.frames.len() - 1;
        &mut self.frames[last]
    }

    /// Adds an element whose pins have been pushed from `first_pin` on.
    pub(super) fn push_element(
        &mut self,
        line: &Line<'_>,
        letter: u8,
        first_pin: usize,
        behaviour: Behaviour,
    ) -> ElementId {
        let id = ElementId::new(self.circuit.elements.len());
        let name = self.name_element(line.word_str(0), id);
        let scope = self.frame().scope;
        let pin_count = self.circuit.pins.len() - first_pin;
        self.circuit.elements.push(Element {
            name,
            scope,
            letter,
            statement: line.span,
            name_at: u16::try_from(line.head().start - line.span.start).unwrap_or(0),
            behaviour,
            first_pin: u32::try_from(first_pin).unwrap_or(NONE),
            pin_count: u32::try_from(pin_count).unwrap_or(NONE),
        });
        self.register(name, id);
        id
    }

    fn name_element(&mut self, name: &str, id: ElementId) -> Symbol {
        if self.frames.len() > 1 {
            return self.circuit.names.intern(name);
        }
        let (symbol, hash) = self.circuit.names.append(name);
        self.root_elements.push((hash, id));
        symbol
    }

    fn register(&mut self, name: Symbol, id: ElementId) {
        if self.frames.len() <= 1 {
            return;
        }
        let folded = self.circuit.names.fold(name);
        let known = *self.frame().elements.entry(folded).or_insert(id);
        if known != id {
            self.tell_duplicate(known, id);
        }
    }

    /// Sorts the root's elements by the hashes of their names, to find them by name, and tells names given twice.
    fn sort_root_elements(&mut self) {
        let mut sorted = std::mem::take(&mut self.root_elements);
        sorted.sort_unstable();
        for same_hash in sorted.chunk_by(|a, b| a.0 == b.0).filter(|group| group.len() > 1) {
            for (n, &(_, id)) in same_hash.iter().enumerate().skip(1) {
                let first = same_hash[..n].iter().map(|e| e.1).find(|&first| self.same_name(first, id));
                if let Some(first) = first {
                    self.tell_duplicate(first, id);
                }
            }
        }
        self.root_elements = sorted;
    }

    fn same_name(&self, a: ElementId, b: ElementId) -> bool {
        let name = |id: ElementId| self.circuit.text(self.circuit.element(id).name);
        name(a).eq_ignore_ascii_case(name(b))
    }

    fn tell_duplicate(&mut self, first: ElementId, second: ElementId) {
        let name = self.circuit.text(self.circuit.element(second).name).to_owned();
        let finding = Finding::new(
            "duplicate-name",
            Severity::Error,
            self.circuit.name_span(second),
            format!("{name} is the name of two elements"),
        )
        .label("the second of that name")
        .also(self.circuit.name_span(first), "the first of that name")
        .about(self.here(&name))
        .help("Rename one of them: other tools refuse the file or drop one of the two without a word.");
        self.tell(finding);
    }

    /// The element of that name in the innermost frame.
    pub(super) fn find_element(&mut self, name: &str) -> Option<ElementId> {
        if self.frames.len() > 1 {
            let folded = self.circuit.names.find(name)?;
            return self.frame().elements.get(&folded).copied();
        }
        let hash = Names::hash(name);
        let first = self.root_elements.partition_point(|e| e.0 < hash);
        let same_hash = self.root_elements.get(first..)?.iter().take_while(|e| e.0 == hash);
        let is_named =
            |id: ElementId| self.circuit.text(self.circuit.element(id).name).eq_ignore_ascii_case(name);
        same_hash.map(|e| e.1).find(|&id| is_named(id))
    }

    /// The node of that name in the innermost frame, new or known.
    pub(super) fn node(&mut self, name: &str, span: Span) -> NodeId {
        if name == "0" || name.eq_ignore_ascii_case("gnd") {
            return NodeId::GROUND;
        }
        let symbol = self.circuit.names.intern(name);
        let folded = self.circuit.names.fold(symbol);
        let next = NodeId::new(self.circuit.nodes.len());
        let in_root = self.frames.len() <= 1
            // a port of that name hides the global node
            || self.globals.contains(&folded) && !self.frame().nodes.contains_key(&folded);
        let id = if in_root {
            let slot = slot(&mut self.root_nodes, folded, NodeId(NONE));
            if slot.0 == NONE {
                *slot = next;
            }
            *slot
        } else {
            *self.frame().nodes.entry(folded).or_insert(next)
        };
        if id == next {
            let scope = if in_root { ScopeId::ROOT } else { self.frame().scope };
            self.circuit.nodes.push(Node { name: symbol, scope, first: span });
        }
        id
    }

    /// The node of that name as the innermost frame sees it, where it is known already.
    pub(super) fn find_node(&mut self, name: &str) -> Option<NodeId> {
        if name == "0" || name.eq_ignore_ascii_case("gnd") {
            return Some(NodeId::GROUND);
        }
        let folded = self.circuit.names.find(name)?;
        let in_root = self.root_nodes.get(folded.index()).copied().filter(|id| id.0 != NONE);
        if self.frames.len() <= 1 {
            return in_root;
        }
        let own = self.frame().nodes.get(&folded).copied();
        own.or_else(|| in_root.filter(|_| self.globals.contains(&folded)))
    }

    /// Puts the words from `first` up to but not including `end` down as pins.
    pub(super) fn push_pins(&mut self, line: &Line<'_>, first: usize, end: usize) {
        for number in first..end {
            let Some(token) = line.word(number) else { return };
            self.push_pin(line, token);
        }
    }

    fn push_pin(&mut self, line: &Line<'_>, token: Token) {
        let span = line.at(token);
        let is_root = self.frames.len() <= 1;
        let node = if is_root { NodeId(NONE) } else { self.node(line.str(token), span) };
        self.circuit.pins.push(Pin { node, span });
        if is_root && self.circuit.pins.len() - self.resolved >= PINS_AT_ONCE {
            self.resolve_pins();
        }
    }

    /// Looks up the nodes of the root's pins that wait for it, many at once, so that the waits for memory overlap.
    pub(super) fn resolve_pins(&mut self) {
        let sources = self.sources;
        let from = self.resolved.min(self.circuit.pins.len());
        let mut hashes = std::mem::take(&mut self.hashes);
        hashes.clear();
        hashes.extend(self.circuit.pins[from..].iter().map(|pin| Names::hash(sources.slice(pin.span))));
        let glance = |seen: u32, &hash: &u32| {
            let (symbol, byte) = self.circuit.names.glance(hash);
            seen ^ u32::from(byte) ^ self.root_nodes.get(symbol.index()).map_or(0, |node| node.0)
        };
        std::hint::black_box(hashes.iter().fold(0, glance));
        self.hashes = hashes;
        for number in from..self.circuit.pins.len() {
            let span = self.circuit.pins[number].span;
            self.circuit.pins[number].node = self.node(sources.slice(span), span);
        }
        self.resolved = self.circuit.pins.len();
    }
}

/// The table's place for a symbol, with the table grown to hold it.
fn slot<T: Copy>(table: &mut Vec<T>, symbol: Symbol, empty: T) -> &mut T {
    if table.len() <= symbol.index() {
        table.resize(symbol.index() + 1, empty);
    }
    &mut table[symbol.index()]
}
