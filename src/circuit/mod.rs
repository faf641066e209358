//! The flat circuit: every element of every instance, its nodes, its behaviour as numbers, and where each of
//! them was written. Built from statements by `build`; nothing here judges or solves.

mod behaviour;
mod block;
mod build;
mod controlled;
pub(crate) mod directory;
mod dot;
mod element;
mod expand;
mod functions;
mod ids;
mod include;
mod instance;
mod line;
mod misworded;
mod note;
mod notes;
mod parameter;
mod parsed;
mod read;
mod semiconductor;
mod settings;
mod shape;
mod slip;
mod source;
mod surplus;
#[cfg(test)]
mod tests;
mod title;
mod told;
mod trail;
mod unknown;
mod unused;
mod value;

pub use behaviour::{Behaviour, Model, ModelKind, Shape, Source, Value};
pub use build::{Reading, read};
pub use expand::{Overrides, expand};
pub use ids::{ElementId, ModelId, NodeId, ScopeId, Symbol};
pub use note::{Expectation, Hold, Note, NoteKind, State};
pub use parsed::Parsed;

use crate::text::Span;

/// One place where an element touches a node.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Pin {
    /// The node.
    pub node: NodeId,
    /// The node's name on the element's line.
    pub span: Span,
}

/// One element after expansion of all instances. Read its parts through the methods of [`Circuit`].
#[derive(Debug, Clone, PartialEq)]
pub struct Element {
    /// Its own name as first written, without the instance path.
    pub name: Symbol,
    /// The instance it stands in.
    pub scope: ScopeId,
    /// Upper-case letter that says what it is: `R`, `D`, …
    pub letter: u8,
    /// Its whole statement (all its continuation lines).
    pub statement: Span,
    /// What it does.
    pub behaviour: Behaviour,
    /// Bytes between the beginning of the statement and its name: commas and brackets count for nothing.
    pub(crate) name_at: u16,
    pub(crate) first_pin: u32,
    pub(crate) pin_count: u32,
}

/// One node of the flat circuit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Node {
    /// Its own name as first written.
    pub name: Symbol,
    /// The instance it belongs to (root for globals).
    pub scope: ScopeId,
    /// Where it was first written.
    pub first: Span,
}

/// One instance of a subcircuit; number 0 is the root circuit.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Scope {
    /// The instance that holds it; `None` for the root.
    pub parent: Option<ScopeId>,
    /// Name of the instance (`X1`); empty for the root.
    pub name: Symbol,
    /// The instance's line; the title for the root.
    pub call: Span,
    /// Name of the subcircuit; empty for the root.
    pub subcircuit: Symbol,
    /// The `.subckt` line.
    pub definition: Span,
}

/// Span of time asked for by `.tran`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Transient {
    /// Suggested step in seconds.
    pub step: f64,
    /// End in seconds.
    pub stop: f64,
    /// Start of what is of interest, in seconds.
    pub start: f64,
    /// Start from initial conditions instead of the operating point.
    pub uic: bool,
}

/// A declared range: `.dc NAME from to step`.
#[derive(Debug, Clone, PartialEq)]
pub struct Sweep {
    /// What is swept: a source, a resistor, a parameter or `temp`.
    pub name: String,
    /// One end.
    pub from: f64,
    /// The other end.
    pub to: f64,
    /// The dot line.
    pub span: Span,
}

/// A whole circuit, flat.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Circuit {
    pub(crate) names: ids::Names,
    /// Instances; number 0 is the root.
    pub scopes: Vec<Scope>,
    /// Nodes; number 0 is ground, present even where nothing touches it.
    pub nodes: Vec<Node>,
    /// Elements in the order of the text, instances expanded in place.
    pub elements: Vec<Element>,
    pub(crate) pins: Vec<Pin>,
    /// Models, each definition once.
    pub models: Vec<Model>,
    /// Notes, in the order of the text, with the scope they stand in.
    pub notes: Vec<Note>,
    /// The title line, where there is one.
    pub title: Option<Span>,
    /// `.temp` or `.options temp`, in degrees Celsius.
    pub temperature: Option<f64>,
    /// `.options tnom`, in degrees Celsius.
    pub nominal_temperature: Option<f64>,
    /// `.dc` lines.
    pub sweeps: Vec<Sweep>,
    /// `.tran`.
    pub transient: Option<Transient>,
    /// Node voltages given by `.ic`, in volts.
    pub initial: Vec<(NodeId, f64)>,
    /// For each file, the include line that brought it in.
    pub(crate) includes: Vec<Option<Span>>,
    /// Something of the file could not be read or found, so the circuit may lack elements.
    pub incomplete: bool,
}

impl Circuit {
    /// The element.
    pub fn element(&self, id: ElementId) -> &Element {
        &self.elements[id.index()]
    }

    /// All elements with their numbers.
    pub fn elements(&self) -> impl DoubleEndedIterator<Item = (ElementId, &Element)> + ExactSizeIterator {
        self.elements.iter().enumerate().map(|(n, e)| (ElementId::new(n), e))
    }

    /// The name at the head of the element's statement; not kept, since its text tells its length.
    pub fn name_span(&self, id: ElementId) -> Span {
        let Element { name, statement, name_at, .. } = self.element(id);
        let length = u32::try_from(self.text(*name).len()).unwrap_or(u32::MAX);
        let start = statement.start + u32::from(*name_at);
        Span { file: statement.file, start, end: start.saturating_add(length).min(statement.end) }
    }

    /// The element's pins in the order of its line (for a diode: anode, cathode).
    pub fn pins(&self, id: ElementId) -> &[Pin] {
        let element = self.element(id);
        let first = element.first_pin as usize;
        &self.pins[first..first + element.pin_count as usize]
    }

    /// The node at pin `pin`; ground where there is no such pin.
    pub fn node(&self, id: ElementId, pin: usize) -> NodeId {
        self.pins(id).get(pin).map_or(NodeId::GROUND, |p| p.node)
    }

    /// The model.
    pub fn model(&self, id: ModelId) -> &Model {
        &self.models[id.index()]
    }

    /// A spelling.
    pub fn text(&self, symbol: Symbol) -> &str {
        self.names.text(symbol)
    }

    /// Name with the instance path before it: `X1:D3`; nodes likewise.
    fn path(&self, scope: ScopeId, name: Symbol) -> String {
        let mut parts = vec![self.text(name)];
        let mut at = scope;
        while let Some(parent) = self.scopes[at.index()].parent {
            parts.push(self.text(self.scopes[at.index()].name));
            at = parent;
        }
        parts.reverse();
        parts.join(":")
    }

    /// The element's full name, `X1:D3`.
    pub fn element_name(&self, id: ElementId) -> String {
        let element = self.element(id);
        self.path(element.scope, element.name)
    }

    /// The instance's full name, `X1:X2`; empty for the root.
    pub fn scope_name(&self, id: ScopeId) -> String {
        match self.scopes.get(id.index()) {
            Some(Scope { parent: Some(parent), name, .. }) => self.path(*parent, *name),
            _ => String::new(),
        }
    }

    /// The node's full name; ground is `0`.
    pub fn node_name(&self, id: NodeId) -> String {
        let node = &self.nodes[id.index()];
        self.path(node.scope, node.name)
    }
}
