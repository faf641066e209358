//! The files as blocks: the root circuit and every subcircuit definition, with what each declares. Nothing is
//! evaluated or expanded yet, so that it can be expanded again with other parameter values.

use super::behaviour::ModelKind;
use crate::finding::Finding;
use crate::text::{FileId, Sources, Span};
use rustc_hash::FxHashMap;
use std::ops::Range;

/// `name = value` as written: a parameter, a default, a model parameter, an option.
#[derive(Debug, Clone)]
pub(crate) struct Setting {
    /// In lower case.
    pub name: String,
    pub name_span: Span,
    /// The number, expression or word; quotes and braces included.
    pub value: Span,
}

/// A `.model` line.
#[derive(Debug, Clone)]
pub(crate) struct ModelLine {
    pub name_span: Span,
    pub statement: Span,
    pub kind: ModelKind,
    pub settings: Vec<Setting>,
    /// All its values are plain numbers, so that it is the same in every instance.
    pub is_constant: bool,
}

/// A `.func` line: its arguments in lower case and the place of its body.
#[derive(Debug, Clone)]
pub(crate) struct Function {
    pub arguments: Vec<String>,
    pub body: Span,
}

/// An element or note line.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Statement {
    pub span: Span,
}

impl Statement {
    /// Whether it is a note. Looked up in the text: a flag would cost four bytes an element.
    pub fn is_note(self, sources: &Sources) -> bool {
        let text = sources.get(self.span.file).map_or(&[][..], |f| f.text.as_bytes());
        text.get(self.span.start as usize) == Some(&b'*')
    }
}

/// The root circuit or one subcircuit definition.
#[derive(Debug, Clone)]
pub(crate) struct Block {
    /// As written; empty for the root.
    pub name_span: Span,
    /// The `.subckt` line; the title for the root.
    pub statement: Span,
    /// The block that holds the definition; the root holds itself.
    pub parent: usize,
    pub ports: Vec<Span>,
    pub defaults: Vec<Setting>,
    pub parameters: Vec<Setting>,
    /// By lower-case name.
    pub models: FxHashMap<String, usize>,
    /// By lower-case name.
    pub subcircuits: FxHashMap<String, usize>,
    /// Statements by number, in order.
    pub body: Vec<Range<usize>>,
    /// `.ic` assignments: node and value.
    pub initial: Vec<(Span, Span)>,
}

impl Block {
    pub fn new(name_span: Span, statement: Span, parent: usize) -> Self {
        Block {
            name_span,
            statement,
            parent,
            ports: Vec::new(),
            defaults: Vec::new(),
            parameters: Vec::new(),
            models: FxHashMap::default(),
            subcircuits: FxHashMap::default(),
            body: Vec::new(),
            initial: Vec::new(),
        }
    }
}

/// All files of one root, read but not evaluated. Give it to [`super::expand`].
#[derive(Debug, Clone)]
pub struct Parsed {
    pub(crate) statements: Vec<Statement>,
    /// Number 0 is the root.
    pub(crate) blocks: Vec<Block>,
    pub(crate) models: Vec<ModelLine>,
    /// For each file, the include line that brought it in.
    pub(crate) includes: Vec<Option<Span>>,
    /// `.func` definitions by lower-case name.
    pub(crate) functions: FxHashMap<String, Function>,
    pub(crate) globals: Vec<Span>,
    /// `.options` and `.temp` settings.
    pub(crate) options: Vec<Setting>,
    /// `.dc` lines: the words of each.
    pub(crate) sweeps: Vec<Vec<Span>>,
    /// `.tran`: its words.
    pub(crate) transient: Option<Vec<Span>>,
    pub(crate) title: Option<Span>,
    pub(crate) findings: Vec<Finding>,
    /// Something could not be read or found.
    pub(crate) incomplete: bool,
    /// An include is missing: what it would define is not reported again.
    pub(crate) include_missing: bool,
}

impl Default for Parsed {
    fn default() -> Self {
        let nowhere = Span::new(FileId(0), 0, 0);
        Parsed {
            statements: Vec::new(),
            blocks: vec![Block::new(nowhere, nowhere, 0)],
            models: Vec::new(),
            includes: Vec::new(),
            functions: FxHashMap::default(),
            globals: Vec::new(),
            options: Vec::new(),
            sweeps: Vec::new(),
            transient: None,
            title: None,
            findings: Vec::new(),
            incomplete: false,
            include_missing: false,
        }
    }
}

impl Parsed {
    /// Number of a model by lower-case name, looked up in `block` and outwards.
    pub(crate) fn find_model(&self, block: usize, name: &str) -> Option<(usize, usize)> {
        self.outwards(block).find_map(|at| Some((at, *self.blocks.get(at)?.models.get(name)?)))
    }

    /// Number of a subcircuit's block by lower-case name, looked up in `block` and outwards.
    pub(crate) fn find_subcircuit(&self, block: usize, name: &str) -> Option<usize> {
        self.outwards(block).find_map(|at| self.blocks.get(at)?.subcircuits.get(name).copied())
    }

    /// Whether the root circuit declares a parameter of that lower-case name.
    pub fn has_parameter(&self, name: &str) -> bool {
        self.blocks.first().is_some_and(|root| root.parameters.iter().any(|s| s.name == name))
    }

    fn outwards(&self, block: usize) -> impl Iterator<Item = usize> + '_ {
        std::iter::successors(Some(block), |&at| {
            let parent = self.blocks.get(at)?.parent;
            (parent != at).then_some(parent)
        })
    }
}
