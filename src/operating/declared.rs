//! What notes, `.dc` lines and options declare about conditions: ranges, supplies, holds, set values. Reading
//! only; `condition` lays the conditions out.

use super::condition::{Supply, level, source};
use super::named::{twice, unknown_name};
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, Note, NoteKind, ScopeId};
use crate::circuit::{Hold, Parsed, Sweep, Symbol};
use crate::complementarity::Level;
use crate::config::Options;
use crate::finding::{Finding, Severity};
use crate::text::{FileId, Span};

/// Names among which the one that was meant is looked for.
const MOST_CANDIDATES: usize = 2000;

/// What a range is about.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Subject {
    /// An independent source.
    Source(ElementId),
    /// A supply, by its place in the list.
    Supply(usize),
    /// A resistor.
    Resistor(ElementId),
    /// A parameter of the root circuit.
    Parameter(String),
    /// The temperature.
    Temperature,
}

/// One declared range.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Range {
    /// Name in conditions.
    pub name: String,
    /// What it is about.
    pub subject: Subject,
    /// First end.
    pub from: f64,
    /// Second end.
    pub to: f64,
    /// Where it was declared.
    pub span: Span,
}

/// Everything declared.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct Declared {
    /// Ranges in the order of declaration.
    pub ranges: Vec<Range>,
    /// Nodes held by notes.
    pub supplies: Vec<Supply>,
    /// Transistors and switches held, sorted by element; those examined both ways are off here.
    pub held: Vec<(ElementId, bool)>,
    /// Those examined both ways, in the order of declaration.
    pub both: Vec<ElementId>,
    /// Sources set by option, the last of equals.
    pub set: Vec<(ElementId, f64)>,
    /// Degrees Celsius in nominal.
    pub temperature: f64,
}

/// Degrees Celsius where nothing else is said.
pub(crate) const USUAL_TEMPERATURE: f64 = 27.0;

/// Reads all declarations.
pub(crate) fn declared(
    circuit: &Circuit,
    parsed: Option<&Parsed>,
    directory: Option<&Directory<'_>>,
    options: &Options,
    findings: &mut Vec<Finding>,
) -> Declared {
    let fed = fed_nodes(circuit);
    let mut reader = Reader {
        circuit,
        parsed,
        directory,
        declared: Declared::default(),
        fed,
        holds: Vec::new(),
        findings,
    };
    reader.declared.temperature = circuit.temperature.unwrap_or(USUAL_TEMPERATURE);
    for note in &circuit.notes {
        match &note.kind {
            NoteKind::Supply { volts, range } => {
                let volts = Level { value: volts.number, exact: volts.written };
                reader.supply(note, volts, *range);
            }
            NoteKind::Hold(hold) => reader.hold(note, *hold),
            NoteKind::Watch { other, .. } => reader.watch(note, *other),
            _ => {}
        }
    }
    reader.set(&options.set);
    reader.all_ranges();
    reader.declared.held.sort_by_key(|h| h.0);
    reader.declared
}

/// The nodes between which and ground a voltage source already stands.
fn fed_nodes(circuit: &Circuit) -> Vec<bool> {
    let mut fed = Vec::new();
    if !circuit.notes.iter().any(|n| matches!(n.kind, NoteKind::Supply { .. })) {
        return fed;
    }
    fed.resize(circuit.nodes.len(), false);
    for (id, element) in circuit.elements() {
        if matches!(element.behaviour, Behaviour::VoltageSource(_)) {
            match (circuit.node(id, 0), circuit.node(id, 1)) {
                (node, NodeId::GROUND) | (NodeId::GROUND, node) => fed[node.index()] = true,
                _ => {}
            }
        }
    }
    fed
}

struct Reader<'a> {
    circuit: &'a Circuit,
    /// What the text declares, where it is at hand: its parameters can have ranges.
    parsed: Option<&'a Parsed>,
    directory: Option<&'a Directory<'a>>,
    declared: Declared,
    /// Nodes, by number, with a voltage source to ground; empty where no note holds a node.
    fed: Vec<bool>,
    holds: Vec<(ElementId, usize, Span)>,
    findings: &'a mut Vec<Finding>,
}

impl Reader<'_> {
    fn element(&self, scope: ScopeId, name: &str) -> Option<ElementId> {
        self.directory.and_then(|d| d.element(scope, name))
    }

    fn node(&self, scope: ScopeId, name: &str) -> Option<NodeId> {
        self.directory.and_then(|d| d.node(scope, name))
    }

    /// What is watched is for the rules; here only whether it is there.
    fn watch(&mut self, note: &Note, other: Option<Symbol>) {
        for name in std::iter::once(note.subject).chain(other) {
            let name = self.circuit.text(name);
            if self.node(note.scope, name).is_none() {
                self.findings.push(unknown_name(name, note, "node"));
            }
        }
    }

    fn supply(&mut self, note: &Note, volts: Level, range: Option<(f64, f64)>) {
        let name = self.circuit.text(note.subject);
        let Some(node) = self.node(note.scope, name) else {
            return self.findings.push(unknown_name(name, note, "node"));
        };
        if node == NodeId::GROUND || self.is_fed(node) {
            return self.findings.push(already_held(name, note));
        }
        if self.declared.supplies.iter().any(|s| s.node == node) {
            return self.findings.push(twice_on_one_node(name, note));
        }
        if let Some((from, to)) = range {
            let name = self.circuit.node_name(node);
            let subject = Subject::Supply(self.declared.supplies.len());
            self.declared.ranges.push(Range { name, subject, from, to, span: note.span });
        }
        self.declared.supplies.push(Supply { node, volts });
    }

    fn is_fed(&self, node: NodeId) -> bool {
        self.fed.get(node.index()).copied().unwrap_or(false)
    }

    fn hold(&mut self, note: &Note, hold: Hold) {
        let name = self.circuit.text(note.subject);
        let Some(id) = self.element(note.scope, name) else {
            return self.findings.push(unknown_name(name, note, "transistor or switch"));
        };
        let behaviour = &self.circuit.element(id).behaviour;
        let holdable = matches!(
            behaviour,
            Behaviour::Transistor { .. } | Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. }
        );
        if !holdable {
            return self.findings.push(not_holdable(name, note));
        }
        // a path from outside and a note inside are two levels; the inner one stands
        let depth = crate::circuit::directory::depth(self.circuit, note.scope);
        if let Some(at) = self.holds.iter().position(|h| h.0 == id) {
            let (_, earlier_depth, span) = self.holds[at];
            if earlier_depth == depth {
                return self.findings.push(twice("hold", name, note, span));
            }
            if earlier_depth > depth {
                return;
            }
            self.holds.remove(at);
            self.declared.held.retain(|h| h.0 != id);
            self.declared.both.retain(|h| *h != id);
        }
        self.holds.push((id, depth, note.span));
        self.declared.held.push((id, hold == Hold::On));
        if hold == Hold::Both {
            self.declared.both.push(id);
        }
    }

    fn set(&mut self, set: &[(String, f64)]) {
        for (name, value) in set {
            let element = self.element(ScopeId::ROOT, name).filter(|&id| source(self.circuit, id).is_some());
            let node = self.node(ScopeId::ROOT, name);
            let supply = self.declared.supplies.iter().position(|s| Some(s.node) == node);
            if let Some(id) = element {
                self.declared.set.retain(|s| s.0 != id);
                self.declared.set.push((id, *value));
            } else if let Some(at) = supply {
                self.declared.supplies[at].volts = level(*value);
                self.declared.ranges.retain(|r| r.subject != Subject::Supply(at));
            } else if name.eq_ignore_ascii_case("temp") {
                self.declared.temperature = *value;
            } else {
                let other = match self.element(ScopeId::ROOT, name) {
                    Some(_) => Some("is no source"),
                    None if self.parsed.is_some_and(|p| p.has_parameter(&name.to_lowercase())) => {
                        Some("is a parameter and no source")
                    }
                    None => None,
                };
                let found = not_settable(self.circuit, name, other);
                self.findings.push(found);
            }
        }
    }

    /// Range notes first, since a person wrote them for this; then `.dc` lines about something else.
    fn all_ranges(&mut self) {
        for note in &self.circuit.notes {
            if let NoteKind::Range { from, to } = note.kind {
                let name = self.circuit.text(note.subject);
                match self.subject(note.scope, name) {
                    Some((name, subject)) => {
                        self.range(Some(note), Range { name, subject, from, to, span: note.span })
                    }
                    None => {
                        let wanted = "source, resistor, held node, parameter or `temp`";
                        self.findings.push(unknown_name(name, note, wanted));
                    }
                }
            }
        }
        for sweep in &self.circuit.sweeps {
            match self.subject(ScopeId::ROOT, &sweep.name) {
                Some((name, subject)) => {
                    let range = Range { name, subject, from: sweep.from, to: sweep.to, span: sweep.span };
                    self.range(None, range);
                }
                None => self.findings.push(unknown_sweep(sweep)),
            }
        }
        self.declared.ranges.sort_by_key(|r| r.span);
    }

    fn range(&mut self, note: Option<&Note>, range: Range) {
        if let Subject::Source(id) = range.subject {
            if self.declared.set.iter().any(|s| s.0 == id) {
                return; // the option made it constant
            }
            if source(self.circuit, id).is_some_and(|s| s.shape.is_some() && s.dc.is_none()) {
                return self.findings.push(moving_range(&range));
            }
        }
        if let Some(earlier) = self.declared.ranges.iter().find(|r| r.subject == range.subject) {
            if let Some(note) = note.filter(|n| n.span != earlier.span) {
                self.findings.push(twice("range", &range.name, note, earlier.span));
            }
            return;
        }
        self.declared.ranges.push(range);
    }

    fn subject(&self, scope: ScopeId, name: &str) -> Option<(String, Subject)> {
        if let Some(id) = self.element(scope, name) {
            let subject = match self.circuit.element(id).behaviour {
                Behaviour::VoltageSource(_) | Behaviour::CurrentSource(_) => Subject::Source(id),
                Behaviour::Resistor(_) => Subject::Resistor(id),
                _ => return None,
            };
            return Some((self.circuit.element_name(id), subject));
        }
        let node = self.node(scope, name);
        if let Some(at) = self.declared.supplies.iter().position(|s| Some(s.node) == node) {
            return Some((self.circuit.node_name(self.declared.supplies[at].node), Subject::Supply(at)));
        }
        if name.eq_ignore_ascii_case("temp") {
            return Some(("temp".into(), Subject::Temperature));
        }
        let is_parameter = self.parsed.is_some_and(|p| p.has_parameter(&name.to_lowercase()));
        (is_parameter && scope == ScopeId::ROOT)
            .then(|| (name.to_owned(), Subject::Parameter(name.to_lowercase())))
    }
}

fn already_held(name: &str, note: &Note) -> Finding {
    Finding::new("unusable-note", Severity::Warning, note.span, format!("the netlist already holds `{name}`"))
        .about(name)
        .help("A `supply` note feeds a node that the netlist leaves unfed. Declare the limits of a source with `*@ range` instead. The note is not used.")
}

fn twice_on_one_node(name: &str, note: &Note) -> Finding {
    Finding::new(
        "conflicting-notes",
        Severity::Warning,
        note.span,
        format!("a second `supply` note for `{name}`"),
    )
    .label("not used")
    .about(name)
    .help("One node has one supply. Keep one of the notes.")
}

fn not_holdable(name: &str, note: &Note) -> Finding {
    let message = format!("`{name}` is neither a transistor nor a switch, so it cannot be held on or off");
    Finding::new("unusable-note", Severity::Warning, note.subject_span, message)
        .about(name)
        .help("`hold` applies to elements Q, M, J, S and W. The note is not used.")
}

/// `other`: what the name stands for instead.
fn not_settable(circuit: &Circuit, name: &str, other: Option<&str>) -> Finding {
    let place = circuit.title.unwrap_or(Span::new(FileId(0), 0, 0));
    let sources = (0..circuit.elements.len())
        .map(ElementId::new)
        .filter(|&id| source(circuit, id).is_some())
        .take(MOST_CANDIDATES);
    let names: Vec<String> = sources.map(|id| circuit.element_name(id)).collect();
    let meant = match (other, crate::text::nearest(name, names.iter().map(String::as_str))) {
        (Some(_), _) => "A `*@ range` note examines other values of a resistor or a parameter. ".to_owned(),
        (None, Some(near)) => format!("Did you mean `{near}`? "),
        (None, None) => String::new(),
    };
    let message = match other {
        Some(what) => format!("`--set {name}=…` cannot be done: {name} {what}"),
        None => format!("`--set {name}=…` names no source of this circuit"),
    };
    Finding::new("unknown-name", Severity::Error, place, message)
        .about(name)
        .help(format!("{meant}Only independent sources, nodes held by a `supply` note, and `temp` can be set; inside an instance write the path, such as `X1:V1`."))
}

fn unknown_sweep(sweep: &Sweep) -> Finding {
    let message = format!("`.dc` sweeps `{}`, which is no source, resistor or `temp` here", sweep.name);
    Finding::new("unknown-name", Severity::Warning, sweep.span, message).about(sweep.name.clone()).help(
        "A `.dc` line declares a range, and its ends are examined as conditions. This one has no effect.",
    )
}

fn moving_range(range: &Range) -> Finding {
    let message = format!("`{}` moves over time and has no DC value that a range could replace", range.name);
    Finding::new("range-without-value", Severity::Warning, range.span, message)
        .label("this range is not examined")
        .about(range.name.clone())
        .help("Its extreme instants are examined anyway. Give the source a DC value to declare a range, or leave the range out.")
}
