//! Diodes and transistors, and the models that elements name.

use super::behaviour::{Behaviour, Model, ModelKind, Value};
use super::element::Read;
use super::expand::Expander;
use super::ids::{ElementId, ModelId, ScopeId};
use super::line::Line;
use crate::finding::{Finding, Severity, list};
use crate::syntax;
use crate::text::Span;

impl Expander<'_> {
    /// `diode = name node node [model] [area] *pair`
    pub(super) fn diode(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        let model = self.model_of(line, rest, id);
        let area = line.pair("area").or_else(|| line.word(rest + 1));
        let area = area.and_then(|t| self.evaluate(line.at(t))).map_or(1.0, |v| v.number);
        let area = if area > 0.0 { area } else { 1.0 };
        Ok(Behaviour::Diode { model, area: area * self.multiple(line) * self.copies() })
    }

    /// `transistor = name 3*4node model [area] *pair`
    pub(super) fn transistor(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        Ok(Behaviour::Transistor { model: self.model_of(line, rest, id) })
    }

    /// Nodes of a Q or M line, by where its model stands: behind `few` or `many` nodes.
    pub(super) fn transistor_nodes(&self, line: &Line<'_>, usual: usize, many: usize) -> usize {
        let words = line.fields.words_before_pairs;
        for nodes in [many, 3] {
            if line.word(nodes + 1).is_some() && self.knows_model(line.word_str(nodes + 1)) {
                return nodes;
            }
        }
        let behind = line.word_str(5);
        let is_area = syntax::plain_number(behind.as_bytes()).is_some() || behind.eq_ignore_ascii_case("off");
        match words {
            0..=4 if usual == 4 && words < 5 => many,
            0..=5 => 3,
            _ if is_area => 3,
            _ => many,
        }
    }

    pub(super) fn knows_model(&self, name: &str) -> bool {
        let block = self.frames.last().map_or(0, |f| f.block);
        self.parsed.find_model(block, &name.to_ascii_lowercase()).is_some()
    }

    /// The model named by word `word`; told where it is not defined.
    pub(super) fn model_of(&mut self, line: &Line<'_>, word: usize, id: ElementId) -> Option<ModelId> {
        let token = line.word(word);
        let found = token.and_then(|t| self.model_named(line.str(t)));
        if found.is_none() {
            let span = token.map_or_else(|| line.head(), |t| line.at(t));
            self.undefined_models.push((span, id));
        }
        found.filter(|&model| self.fits(line, word, model))
    }

    /// Whether a model is of the type that the element's letter takes; told where not.
    fn fits(&mut self, line: &Line<'_>, word: usize, id: ModelId) -> bool {
        let letter = line.word_str(0).chars().next().unwrap_or(' ').to_ascii_uppercase();
        let model = self.circuit.model(id);
        let (fits, wanted) = match letter {
            'D' => (model.kind == ModelKind::Diode, "D"),
            'Q' => (matches!(model.kind, ModelKind::Npn | ModelKind::Pnp), "NPN or PNP"),
            'M' => (matches!(model.kind, ModelKind::Nmos | ModelKind::Pmos), "NMOS or PMOS"),
            'J' => (matches!(model.kind, ModelKind::Njf | ModelKind::Pjf), "NJF or PJF"),
            'S' => (model.kind == ModelKind::VoltageSwitch, "SW"),
            'W' => (model.kind == ModelKind::CurrentSwitch, "CSW"),
            _ => (true, ""),
        };
        if fits || model.kind == ModelKind::Other {
            return true;
        }
        let (name, place) = (line.word_str(0), model.name_span);
        let span = line.word(word).map_or_else(|| line.head(), |t| line.at(t));
        let message = format!("{name} names {}, which is no model of type {wanted}", line.word_str(word));
        let finding = Finding::new("wrong-model-type", Severity::Warning, span, message)
            .label(format!("type {wanted} belongs here"))
            .also(place, "defined here")
            .about(self.here(name))
            .help("Correct the model's name or its type; until then the element counts as having no model.");
        self.tell(finding);
        false
    }

    pub(super) fn model_named(&mut self, name: &str) -> Option<ModelId> {
        let block = self.frame().block;
        let (holder, model) = self.parsed.find_model(block, &name.to_ascii_lowercase())?;
        // a model with expressions is another one in every instance of the block that holds it
        let is_constant = self.parsed.models[model].is_constant;
        let frame =
            if is_constant { 0 } else { self.frames.iter().rposition(|f| f.block == holder).unwrap_or(0) };
        let key = (model, self.frames.get(frame).map_or(ScopeId::ROOT, |f| f.scope));
        if let Some(&known) = self.model_ids.get(&key) {
            return Some(known);
        }
        let id = self.make_model(model, frame);
        self.model_ids.insert(key, id);
        Some(id)
    }

    fn make_model(&mut self, number: usize, frame: usize) -> ModelId {
        let line = &self.parsed.models[number];
        let name = self.circuit.names.intern(self.sources.slice(line.name_span));
        let mut parameters = Vec::with_capacity(line.settings.len());
        for setting in &line.settings {
            let worth = self.worth_in(frame, setting.value, false);
            self.judge_slip(self.sources.slice(line.name_span), worth);
            if let Some(value) = worth.value() {
                parameters.push((setting.name.clone(), value));
            }
        }
        let id = ModelId::new(self.circuit.models.len());
        self.circuit.models.push(Model {
            name,
            kind: line.kind,
            parameters,
            statement: line.statement,
            name_span: line.name_span,
        });
        id
    }

    /// Value of a resistor, capacitor or inductor that its model gives.
    pub(super) fn model_value(&mut self, line: &Line<'_>, word: usize, key: &str) -> Option<Value> {
        let name = line.word(word).map(|t| line.str(t))?;
        let id = self.model_named(name)?;
        let model = self.circuit.model(id);
        matches!(model.kind, ModelKind::Resistor | ModelKind::Capacitor | ModelKind::Inductor)
            .then(|| model.parameter(key))
            .flatten()
    }

    /// One finding for all models that are named and not defined.
    pub(super) fn tell_undefined_models(&mut self) {
        let mut spans = std::mem::take(&mut self.undefined_models);
        if self.parsed.include_missing || spans.is_empty() {
            return;
        }
        let mut seen = rustc_hash::FxHashSet::default();
        spans.retain(|(span, _)| seen.insert(self.sources.slice(*span).to_ascii_lowercase()));
        let Some((&(first, id), rest)) = spans.split_first() else { return };
        let is_bare = |&(span, id): &(Span, ElementId)| self.circuit.name_span(id) == span;
        let label = |place: &(Span, ElementId)| if is_bare(place) { "names no model" } else { "not defined" };
        let names = |bare: bool| -> Vec<&str> {
            spans.iter().filter(|place| is_bare(place) == bare).map(|(s, _)| self.sources.slice(*s)).collect()
        };
        let mut finding =
            Finding::new("undefined-model", Severity::Warning, first, without_model(&names(true), &names(false)))
                .label(label(&(first, id)))
                .about(self.sources.slice(first))
                .help("Add its .model line or include the file that holds it; until then a diode counts as silicon with the default drop.");
        for place in rest.iter().take(7) {
            finding = finding.also(place.0, label(place));
        }
        self.tell(finding);
    }
}

/// Elements that name no model, and models that are named and not defined, in one sentence.
fn without_model(bare: &[&str], undefined: &[&str]) -> String {
    let first = match undefined {
        [] => None,
        [only] => Some(format!("the model {only} is not defined")),
        _ => Some(format!("{} models are named and not defined: {}", undefined.len(), shortened(undefined))),
    };
    let second = match bare {
        [] => None,
        [only] => Some(format!("{only} names no model, so nothing is known about it")),
        _ => Some(format!("{} name no model, so nothing is known about them", shortened(bare))),
    };
    first.into_iter().chain(second).collect::<Vec<_>>().join("; ")
}

/// Up to eight names.
pub(super) fn shortened(names: &[&str]) -> String {
    list(names, 8)
}
