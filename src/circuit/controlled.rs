//! Controlled sources, couplings and switches: elements that look at other nodes or other elements.

use super::behaviour::{Behaviour, ModelKind, Value};
use super::element::{Problem, Read, scaled};
use super::expand::Expander;
use super::ids::{ElementId, ModelId};
use super::line::Line;
use super::parameter::Worth;
use super::value::Quantity;
use crate::finding::{Finding, Severity};
use crate::text::Span;

impl Expander<'_> {
    /// Pins of an E or G line: four in the linear form, else only its two outputs.
    pub(super) fn output_nodes(&self, line: &Line<'_>) -> usize {
        let word = line.word_str(3);
        let other = ["poly", "value", "table", "laplace", "freq", "vol", "cur", "and", "nand", "or", "nor"];
        if line.fields.words_before_pairs < 5 && !line.fields.pairs.is_empty() {
            return 2;
        }
        match other.iter().find(|w| word.eq_ignore_ascii_case(w)) {
            Some(_) => 2,
            None => 4,
        }
    }

    /// `voltage-by-voltage = name node node node node value`, or `POLY(1)` where that is linear
    pub(super) fn voltage_by_voltage(&mut self, line: &Line<'_>, rest: usize) -> Read {
        Ok(self.by_voltage(line, rest)?.map_or(NOT_LINEAR, |gain| Behaviour::VoltageByVoltage { gain }))
    }

    /// `current-by-voltage`: likewise
    pub(super) fn current_by_voltage(&mut self, line: &Line<'_>, rest: usize) -> Read {
        let copies = self.copies() * self.multiple(line);
        let gain = self.by_voltage(line, rest)?.map(|gain| scaled(gain, copies));
        Ok(gain.map_or(NOT_LINEAR, |gain| Behaviour::CurrentByVoltage { gain }))
    }

    fn by_voltage(&mut self, line: &Line<'_>, rest: usize) -> Result<Option<Value>, Problem> {
        if rest == 5 {
            return self.gain(line, rest).map(Some);
        }
        let variables = line.word_str(4).parse::<usize>().ok().filter(|_| line.is(3, "poly"));
        let Some(variables) = variables else { return Ok(None) };
        // whatever the polynomial is, the element looks at these nodes
        self.push_pins(line, 5, 5 + 2 * variables.min(line.len()));
        if variables != 1 {
            return Ok(None);
        }
        Ok(self.linear_polynomial(line, 7))
    }

    /// The gain of a polynomial of one variable that is a straight line through zero.
    fn linear_polynomial(&mut self, line: &Line<'_>, first: usize) -> Option<Value> {
        let mut values = Vec::new();
        for number in first..line.len() {
            values.push(self.value(line, line.word(number)?, Quantity::Plain).value()?);
        }
        let straight = values.iter().enumerate().all(|(n, v)| n == 1 || v.number == 0.0);
        match values.as_slice() {
            [only] => Some(*only),
            [_, gain, ..] if straight => Some(*gain),
            _ => None,
        }
    }

    /// `voltage-by-current = name node node element value`
    pub(super) fn voltage_by_current(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        // the current that it follows is that of all copies together
        let share = 1.0 / self.copies();
        let gain = self.by_current(line, rest, id)?.map(|gain| scaled(gain, share));
        Ok(gain.map_or(NOT_LINEAR, |gain| Behaviour::VoltageByCurrent { gain, control: None }))
    }

    /// `current-by-current`: likewise
    pub(super) fn current_by_current(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        // copies of the instance share both currents; m= on the line itself multiplies this one alone
        let multiple = self.multiple(line);
        let gain = self.by_current(line, rest, id)?.map(|gain| scaled(gain, multiple));
        Ok(gain.map_or(NOT_LINEAR, |gain| Behaviour::CurrentByCurrent { gain, control: None }))
    }

    fn by_current(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Result<Option<Value>, Problem> {
        if !line.fields.pairs.is_empty() && line.fields.words_before_pairs <= rest {
            return Ok(None);
        }
        if line.is(rest, "poly") {
            if !line.is(rest + 1, "1") {
                return Ok(None);
            }
            self.look_up_later(line, id, rest + 2, rest + 3);
            return Ok(self.linear_polynomial(line, rest + 3));
        }
        let gain = self.gain(line, rest + 1)?;
        self.look_up_later(line, id, rest, rest + 1);
        Ok(Some(gain))
    }

    fn gain(&mut self, line: &Line<'_>, word: usize) -> Result<Value, Problem> {
        let keyed = line.pair("gain").or_else(|| line.word(word));
        let worth = keyed.map_or(Worth::Word, |t| self.value(line, t, Quantity::Plain));
        if matches!(worth, Worth::Told | Worth::Moving) {
            return Err(Problem::told("a value that could not be evaluated"));
        }
        worth.value().ok_or_else(|| Problem {
            told: false,
            span: line.word(word).map_or(line.span, |t| line.at(t)),
            message: match line.word_str(word) {
                "" => format!("{} has no gain", line.word_str(0)),
                text => format!("the gain of {}, {text}, is no number", line.word_str(0)),
            },
            reason: "a value that could not be read",
            help: "Write the gain as a number behind what controls the source.".into(),
        })
    }

    /// `coupling = name element 1*element value`
    pub(super) fn coupling(&mut self, line: &Line<'_>, id: ElementId) -> Read {
        let last = line.len().saturating_sub(1);
        let worth = line.word(last).filter(|_| last >= 3).map(|t| self.value(line, t, Quantity::Plain));
        if matches!(worth, Some(Worth::Told | Worth::Moving)) {
            return Err(Problem::told("a value that could not be evaluated"));
        }
        let coefficient = worth.and_then(Worth::value);
        let Some(coefficient) = coefficient else {
            return Err(Problem {
                told: false,
                span: line.span,
                message: format!("{} needs two or more inductors and then one coefficient", line.word_str(0)),
                reason: "a coupling that could not be read",
                help: "Write it as `K1 L1 L2 0.99`.".into(),
            });
        };
        self.look_up_later(line, id, 1, last);
        Ok(Behaviour::Coupling { coils: Box::default(), coefficient: coefficient.number })
    }

    /// `voltage-switch = name node node node node model [state]`
    pub(super) fn voltage_switch(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        if self.copies() != 1.0 {
            return Ok(SWITCHES);
        }
        let model = self.model_of(line, rest, id);
        Ok(if self.is_strange(model) { STRANGE } else { Behaviour::VoltageSwitch { model } })
    }

    /// `current-switch = name node node element model [state]`
    pub(super) fn current_switch(&mut self, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        if self.copies() != 1.0 {
            return Ok(SWITCHES);
        }
        self.look_up_later(line, id, rest, rest + 1);
        let model = self.model_of(line, rest + 1, id);
        Ok(if self.is_strange(model) { STRANGE } else { Behaviour::CurrentSwitch { model, control: None } })
    }

    /// A model of a type whose parameters mean something else, or nothing, here.
    fn is_strange(&self, model: Option<ModelId>) -> bool {
        model.is_some_and(|id| self.circuit.model(id).kind == ModelKind::Other)
    }

    fn look_up_later(&mut self, line: &Line<'_>, id: ElementId, first: usize, end: usize) {
        let spans = (first..end).filter_map(|n| line.word(n)).map(|t| line.at(t)).collect();
        self.frame().late.push((id, spans));
    }

    /// Resolves the names of other elements, now that all of the instance are known.
    pub(super) fn late(&mut self) {
        for (id, spans) in std::mem::take(&mut self.frame().late) {
            let found: Vec<ElementId> =
                spans.iter().filter_map(|&span| self.other_element(id, span)).collect();
            let complete = found.len() == spans.len();
            self.attach(id, found, complete);
        }
    }

    fn attach(&mut self, id: ElementId, found: Vec<ElementId>, complete: bool) {
        let Some(element) = self.circuit.elements.get_mut(id.index()) else { return };
        match &mut element.behaviour {
            Behaviour::Coupling { coils, .. } if complete => *coils = found.into_boxed_slice(),
            Behaviour::VoltageByCurrent { control, .. }
            | Behaviour::CurrentByCurrent { control, .. }
            | Behaviour::CurrentSwitch { control, .. } => *control = found.first().copied(),
            _ => {}
        }
        if !complete {
            element.behaviour = Behaviour::Unknown { reason: "it names an element that is not there" };
            self.circuit.incomplete = true;
        }
    }

    fn other_element(&mut self, id: ElementId, span: Span) -> Option<ElementId> {
        let name = self.sources().slice(span);
        let coupling = self.circuit.element(id).letter == b'K';
        let found = self.find_element(name);
        let fits = found.is_some_and(|f| {
            let letter = self.circuit.element(f).letter;
            if coupling { letter == b'L' } else { matches!(letter, b'V' | b'E' | b'H' | b'L') }
        });
        if fits {
            return found;
        }
        let user = self.circuit.text(self.circuit.element(id).name).to_owned();
        let wanted = if coupling { "inductor" } else { "voltage source whose current it could follow" };
        let message = match found {
            Some(_) => format!("{user} names {name}, which is no {wanted}"),
            None => format!("{user} names {name}, and there is no such element here"),
        };
        self.tell(
            Finding::new("missing-element", Severity::Error, span, message)
                .label(format!("no {wanted}"))
                .about(self.here(&user))
                .help("Correct the name; until then the element counts as unknown on its nodes."),
        );
        None
    }
}

/// Their resistances are the model's.
const SWITCHES: Behaviour = Behaviour::Unknown { reason: "a switch in an instance that stands for several" };
const STRANGE: Behaviour = Behaviour::Unknown { reason: "a switch whose model is not of type SW or CSW" };
const NOT_LINEAR: Behaviour = Behaviour::Unknown { reason: "a controlled source that is not linear" };
