//! `expect` notes against the states: which note speaks for which diode or node, and what was found instead. The
//! findings themselves are made by the two rules about expectations.

use super::Evidence;
use super::condition::same_condition;
use super::met::{Met, diode_met, node_met};
use crate::circuit::directory::{Directory, depth, outward};
use crate::circuit::{Behaviour, ElementId, Expectation, NodeId, Note, NoteKind, State};
use crate::finding::{Finding, Severity, interval};
use crate::operating::{Case, Operating};
use crate::text::Span;
use rustc_hash::FxHashMap;
use std::collections::BTreeSet;

/// What a note expects something of.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum About {
    /// A diode.
    Diode(ElementId),
    /// The voltage of a node.
    Node(NodeId),
}

/// One note about one diode or node.
pub struct Claim<'a> {
    /// The note.
    pub note: &'a Note,
    /// What it expects.
    pub wanted: &'a Expectation,
    /// Of what.
    pub about: About,
    /// How near the note stands: depth of its scope, and whether it names the element rather than its model.
    nearness: (usize, bool),
}

/// What was found in some conditions where something else was expected.
pub struct Found {
    /// In words with numbers: `blocking`, `conducting 9.1 mA`.
    pub words: String,
    /// Numbers of the conditions.
    pub cases: Vec<usize>,
    /// The reasoning, in one line.
    pub why: String,
}

/// What became of a claim.
pub enum Outcome {
    /// It holds, or a nearer note speaks.
    Held,
    /// It does not.
    Broken(Vec<Found>),
    /// It could not be checked, and why.
    Unchecked(String),
}

/// All claims of the circuit's notes, and findings about those that name nothing or that say one thing twice.
pub fn claims<'a>(evidence: &Evidence<'a>) -> (Vec<Claim<'a>>, Vec<Finding>) {
    let circuit = evidence.circuit;
    let (mut claims, mut findings) = (Vec::new(), Vec::new());
    if !circuit.notes.iter().any(|n| matches!(n.kind, NoteKind::Expect(_))) {
        return (claims, findings);
    }
    let directory = Directory::of(circuit);
    let mut told: BTreeSet<Span> = BTreeSet::new();
    for note in &circuit.notes {
        let NoteKind::Expect(wanted) = &note.kind else { continue };
        match abouts(evidence, &directory, note, wanted) {
            Ok(abouts) => claims.extend(abouts.into_iter().map(|(about, is_element)| Claim {
                note,
                wanted,
                about,
                nearness: (depth(circuit, note.scope), is_element),
            })),
            // an instance repeats the notes of its subcircuit
            Err(finding) if told.insert(note.span) => findings.push(*finding),
            Err(_) => {}
        }
    }
    findings.extend(said_twice(evidence, &claims));
    (claims, findings)
}

/// The diodes or the node that a note names, and whether it names the element itself.
fn abouts(
    evidence: &Evidence<'_>,
    directory: &Directory<'_>,
    note: &Note,
    wanted: &Expectation,
) -> Result<Vec<(About, bool)>, Box<Finding>> {
    let circuit = evidence.circuit;
    let name = circuit.text(note.subject);
    if wanted.is_voltage {
        let node = directory.node(note.scope, name).ok_or_else(|| Box::new(nothing(note, name, "node")))?;
        return Ok(vec![(About::Node(node), true)]);
    }
    if let Some(id) = directory.element(note.scope, name) {
        return match circuit.element(id).behaviour {
            Behaviour::Diode { .. } => Ok(vec![(About::Diode(id), true)]),
            _ => Err(Box::new(no_diode(note, name))),
        };
    }
    let is_of_model = |id: ElementId| {
        let Behaviour::Diode { model: Some(model), .. } = circuit.element(id).behaviour else { return false };
        circuit.text(circuit.model(model).name).eq_ignore_ascii_case(name)
            && outward(circuit, circuit.element(id).scope).any(|scope| scope == note.scope)
    };
    let is_model = circuit.models.iter().any(|m| circuit.text(m.name).eq_ignore_ascii_case(name));
    if !is_model {
        return Err(Box::new(nothing(note, name, "diode or model")));
    }
    let ids = circuit.elements().map(|(id, _)| id).filter(|&id| is_of_model(id));
    Ok(ids.map(|id| (About::Diode(id), false)).collect())
}

fn nothing(note: &Note, name: &str, wanted: &str) -> Finding {
    let message = format!("no {wanted} here is named `{name}`");
    Finding::new("unknown-name", Severity::Warning, note.subject_span, message)
        .label("names nothing in this circuit")
        .about(name)
        .help("An expectation about nothing is not checked. Correct the name, or move the note into the subcircuit it is about; inside an instance write the path, such as `X1:D3`.")
}

fn no_diode(note: &Note, name: &str) -> Finding {
    let message = format!("`{name}` is no diode, so it is neither conducting nor blocking");
    Finding::new("unusable-note", Severity::Warning, note.subject_span, message)
        .about(name)
        .help("Expect a state of a diode or of all diodes of a model, or write `v(NODE)` for a voltage. The note is not used.")
}

/// A second claim of one kind about the same thing in the same place.
fn said_twice(evidence: &Evidence<'_>, claims: &[Claim<'_>]) -> Vec<Finding> {
    let mut findings = Vec::new();
    let mut told: BTreeSet<Span> = BTreeSet::new();
    let mut known: FxHashMap<About, Vec<&Claim<'_>>> = FxHashMap::default();
    for claim in claims.iter().filter(|c| c.is_plain()) {
        let same = |other: &&&Claim<'_>| {
            other.nearness == claim.nearness
                && other.wanted.at == claim.wanted.at
                && other.note.span != claim.note.span
        };
        let earlier = known.entry(claim.about).or_default();
        let first = earlier.iter().find(same).copied();
        earlier.push(claim);
        let Some(earlier) = first else { continue };
        if told.insert(claim.note.span) {
            let name = evidence.circuit.text(claim.note.subject);
            let message = format!("a second `expect` note for `{name}`");
            findings.push(
                Finding::new("conflicting-notes", Severity::Warning, claim.note.span, message)
                    .label("as strict as the first")
                    .also(earlier.note.span, "the first")
                    .about(name)
                    .help("Both are checked, and nobody can see which was meant. Keep one of them, or say with `at CONDITION` where each holds."),
            );
        }
    }
    findings
}

/// The claims about each thing, looked up once: any of them may be nearer than another.
pub struct Rivals<'c, 'a>(FxHashMap<About, Vec<&'c Claim<'a>>>);

impl<'c, 'a> Rivals<'c, 'a> {
    /// Among all claims.
    pub fn of(all: &'c [Claim<'a>]) -> Self {
        let mut by_thing: FxHashMap<About, Vec<&'c Claim<'a>>> = FxHashMap::default();
        for claim in all {
            by_thing.entry(claim.about).or_default().push(claim);
        }
        Rivals(by_thing)
    }
}

impl Claim<'_> {
    /// `D1`, `v(out)`.
    pub fn subject(&self, evidence: &Evidence<'_>) -> String {
        match self.about {
            About::Diode(id) => evidence.name(id),
            About::Node(node) => format!("v({})", evidence.circuit.node_name(node)),
        }
    }

    /// Neither `in some condition` nor `over time`, of which several make sense.
    fn is_plain(&self) -> bool {
        !self.wanted.some && !self.wanted.over_time
    }

    /// Whether this claim speaks about a condition at all.
    fn speaks_of(&self, case: &Case) -> bool {
        self.wanted.at.as_deref().is_none_or(|at| same_condition(at, &case.name))
    }

    /// Whether a nearer note about the same thing speaks in its place.
    fn is_outdone(&self, nearer: &[&Claim<'_>], case: &Case) -> bool {
        let outdoes = |other: &&Claim<'_>| {
            other.nearness > self.nearness
                && (other.wanted.some, other.wanted.over_time) == (self.wanted.some, self.wanted.over_time)
                && other.speaks_of(case)
        };
        nearer.iter().any(outdoes)
    }

    /// Holds the claim against the states.
    pub fn judge(&self, evidence: &Evidence<'_>, operating: &Operating, rivals: &Rivals<'_, '_>) -> Outcome {
        let spoken: Vec<usize> =
            (0..operating.cases.len()).filter(|&n| self.speaks_of(&operating.cases[n])).collect();
        if spoken.is_empty() {
            return Outcome::Unchecked(no_condition(operating, self.wanted.at.as_deref().unwrap_or("")));
        }
        // an extreme instant says nothing final about a part with a memory; who names it asks about that instant
        let named = self.wanted.at.is_some();
        let judged: Vec<usize> = spoken
            .iter()
            .copied()
            .filter(|&n| named || !(operating.cases[n].instant && self.is_left_to_time(operating)))
            .collect();
        if judged.is_empty() {
            return Outcome::Unchecked(
                "a moving source reaches this through a capacitor, an inductor or a coupling, so one instant cannot judge it; write `over time`"
                    .into(),
            );
        }
        let nearer = rivals.0.get(&self.about).map_or(&[][..], Vec::as_slice);
        let own: Vec<usize> =
            judged.into_iter().filter(|&n| !self.is_outdone(nearer, &operating.cases[n])).collect();
        let met: Vec<(usize, Met)> =
            own.iter().flat_map(|&n| self.in_case(evidence, &operating.cases[n], n)).collect();
        if self.wanted.some && met.iter().any(|(_, met)| matches!(met, Met::Yes)) {
            return Outcome::Held;
        }
        gather(operating, met)
    }

    fn is_left_to_time(&self, operating: &Operating) -> bool {
        match self.about {
            About::Diode(id) => operating.left_to_time.binary_search(&id).is_ok(),
            About::Node(node) => operating.nodes_left_to_time.binary_search(&node).is_ok(),
        }
    }

    /// What each consistent set of a condition says.
    fn in_case(&self, evidence: &Evidence<'_>, case: &Case, number: usize) -> Vec<(usize, Met)> {
        let met = |solution| match self.about {
            About::Diode(id) => diode_met(evidence.circuit, case, solution, id, self.wanted),
            About::Node(node) => node_met(evidence.circuit, solution, node, self.wanted),
        };
        if case.solutions.is_empty() {
            return vec![(number, Met::Unknown("nothing could be solved there".into()))];
        }
        case.solutions.iter().map(|s| (number, met(s))).collect()
    }
}

/// Puts together what is alike.
fn gather(operating: &Operating, met: Vec<(usize, Met)>) -> Outcome {
    let mut found: Vec<Found> = Vec::new();
    let mut unknown: Option<(usize, String)> = None;
    for (number, met) in met {
        match met {
            Met::Yes => {}
            Met::Unknown(why) => {
                unknown.get_or_insert((number, why));
            }
            Met::No { kind, words, why } => match found.iter_mut().find(|f| f.words.starts_with(kind)) {
                Some(known) if known.cases.last() == Some(&number) => {}
                Some(known) => known.cases.push(number),
                None => found.push(Found { words, cases: vec![number], why }),
            },
        }
    }
    match (found.is_empty(), unknown) {
        (false, _) => Outcome::Broken(found),
        (true, Some((number, why))) => {
            let name = operating.cases.get(number).map_or("", |c| c.name.as_str());
            Outcome::Unchecked(format!("in condition {name}, {why}"))
        }
        (true, None) => Outcome::Held,
    }
}

fn no_condition(operating: &Operating, at: &str) -> String {
    let names: Vec<String> = operating.cases.iter().map(|c| c.name.clone()).collect();
    format!("there is no condition `{at}`; there are {}", super::list(&names))
}

/// `conducting 2 mA … 5 mA at VIN=9`
pub fn expected(wanted: &Expectation) -> String {
    let state = match wanted.state {
        Some(State::Breakdown) => "in breakdown",
        Some(state) => state.word(),
        None => "",
    };
    let unit = if wanted.is_voltage { "V" } else { "A" };
    let range = wanted.range.map(|(low, high)| interval(low, high, unit)).unwrap_or_default();
    let place = match (&wanted.at, wanted.some, wanted.over_time) {
        (Some(at), _, _) => format!("at {at}"),
        (_, true, _) => "in some condition".into(),
        (_, _, true) => "over time".into(),
        _ => String::new(),
    };
    [state, &range, &place].into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ")
}
