//! One element line to one element: nodes by the letter, then what stands behind them.

use super::behaviour::{Behaviour, Value};
use super::expand::Expander;
use super::ids::ElementId;
use super::line::Line;
use super::parameter::Worth;
use super::value::Quantity;
use crate::finding::{Edit, Finding, Severity};
use crate::syntax;
use crate::text::{FileId, Span};

/// Why an element could not be read: where, in one sentence, and what to do.
pub(super) struct Problem {
    pub span: Span,
    /// A finding has told it already.
    pub told: bool,
    pub message: String,
    pub reason: &'static str,
    pub help: String,
}

impl Problem {
    /// One that a finding has told already, or that needs none.
    pub fn told(reason: &'static str) -> Self {
        Problem {
            span: Span::new(FileId(0), 0, 0),
            told: true,
            message: String::new(),
            reason,
            help: String::new(),
        }
    }
}

/// What stands behind the nodes, or why it could not be read.
pub(super) type Read = Result<Behaviour, Problem>;

impl Expander<'_> {
    /// `element = resistor / capacitor / … / unknown-element`
    pub(super) fn element(&mut self, line: &Line<'_>, broken: bool) {
        let Some(letter) = line.word_str(0).bytes().next().map(|b| b.to_ascii_uppercase()) else {
            return self.nameless(line);
        };
        if letter == b'X' {
            return self.instance(line, broken);
        }
        if letter == b'J' && !broken && self.is_connector(line) {
            return self.connector(line);
        }
        let Some(nodes) = self.node_count(letter, line) else {
            return self.unknown_element(line, letter);
        };
        let first_pin = self.circuit.pins.len();
        let available = if broken { line.len().min(nodes + 1) } else { line.len() };
        self.push_pins(line, 1, (nodes + 1).min(available));
        let id = ElementId::new(self.circuit.elements.len());
        let behaviour = if broken {
            self.circuit.incomplete = true;
            Behaviour::Unknown { reason: "a line that could not be read to its end" }
        } else if line.len() <= nodes {
            self.too_few_nodes(line, letter, nodes)
        } else {
            let read = self.behaviour(letter, line, nodes + 1, id);
            let behaviour = read.unwrap_or_else(|problem| self.unreadable(line, problem));
            self.tell_surplus(line, letter, nodes + 1, &behaviour);
            behaviour
        };
        self.push_element(line, letter, first_pin, behaviour);
    }

    /// How many nodes an element of this letter has; `None` for letters not known here.
    fn node_count(&self, letter: u8, line: &Line<'_>) -> Option<usize> {
        Some(match letter {
            b'R' | b'C' | b'L' | b'V' | b'I' | b'D' | b'B' | b'F' | b'H' | b'W' => 2,
            b'E' | b'G' => self.output_nodes(line),
            b'S' | b'T' => 4,
            b'K' => 0,
            b'Q' => self.transistor_nodes(line, 3, 4),
            b'M' => self.transistor_nodes(line, 4, 4).min(4),
            b'J' => 3,
            _ => return None,
        })
    }

    fn behaviour(&mut self, letter: u8, line: &Line<'_>, rest: usize, id: ElementId) -> Read {
        match letter {
            b'R' => self.resistor(line, rest),
            b'C' => self.capacitor(line, rest),
            b'L' => self.inductor(line, rest),
            b'K' => self.coupling(line, id),
            b'V' => self.voltage_source(line, rest),
            b'I' => self.current_source(line, rest),
            b'D' => self.diode(line, rest, id),
            b'E' => self.voltage_by_voltage(line, rest),
            b'G' => self.current_by_voltage(line, rest),
            b'H' => self.voltage_by_current(line, rest, id),
            b'F' => self.current_by_current(line, rest, id),
            b'S' => self.voltage_switch(line, rest, id),
            b'W' => self.current_switch(line, rest, id),
            b'Q' | b'M' | b'J' => self.transistor(line, rest, id),
            b'B' => Ok(Behaviour::Unknown { reason: "a behavioural source" }),
            _ => Ok(Behaviour::Unknown { reason: "a transmission line" }),
        }
    }

    /// `resistor = name node node [model] value *pair`
    fn resistor(&mut self, line: &Line<'_>, rest: usize) -> Read {
        let (value, multiple) = self.passive(line, rest, Quantity::Ohms, "r")?;
        Ok(Behaviour::Resistor(scaled(value, 1.0 / (multiple * self.copies()))))
    }

    /// `capacitor = name node node [model] value *pair`
    fn capacitor(&mut self, line: &Line<'_>, rest: usize) -> Read {
        let (value, multiple) = self.passive(line, rest, Quantity::Farads, "c")?;
        let initial = self.initial(line);
        Ok(Behaviour::Capacitor { farads: scaled(value, multiple * self.copies()), initial })
    }

    /// `inductor = name node node [model] value *pair`
    fn inductor(&mut self, line: &Line<'_>, rest: usize) -> Read {
        let (value, multiple) = self.passive(line, rest, Quantity::Henries, "l")?;
        let multiple = multiple * self.copies();
        let initial = self.initial(line).map(|amperes| amperes * multiple);
        Ok(Behaviour::Inductor { henries: scaled(value, 1.0 / multiple), initial })
    }

    /// `ic=…`
    fn initial(&mut self, line: &Line<'_>) -> Option<f64> {
        let token = line.pair("ic")?;
        self.evaluate(line.at(token)).map(|v| v.number)
    }

    /// How many copies of the innermost instance lie in parallel: `m=…` on its line and on those around it. All are
    /// alike, so that they are one instance with so many times the conductances.
    pub(super) fn copies(&self) -> f64 {
        self.frames.last().map_or(1.0, |frame| frame.copies)
    }

    /// `m=…`: so many in parallel; 1 where it is absent or makes no sense.
    pub(super) fn multiple(&mut self, line: &Line<'_>) -> f64 {
        let token = line.pair("m");
        let value = token.and_then(|t| self.evaluate(line.at(t))).map_or(1.0, |v| v.number);
        if value > 0.0 { value } else { 1.0 }
    }

    /// Value of a two-terminal element: bare, by key, or from its model.
    fn passive(
        &mut self,
        line: &Line<'_>,
        rest: usize,
        quantity: Quantity,
        key: &str,
    ) -> Result<(Value, f64), Problem> {
        let multiple = self.multiple(line);
        if let Some(range) = line.fields.decimal_comma(line.text, rest) {
            let span = Span { file: line.file(), start: range.0, end: range.1 };
            return self.decimal_comma(line.word_str(0), span).map(|value| (value, multiple));
        }
        let keyed = line.pair(key).or_else(|| line.pair("value"));
        for token in keyed.into_iter().chain([rest, rest + 1].into_iter().filter_map(|n| line.word(n))) {
            match self.value(line, token, quantity) {
                Worth::Is(value) => return Ok((value, multiple)),
                Worth::Word => {}
                Worth::Told => return Err(Problem::told("a value that could not be evaluated")),
                Worth::Moving => return Err(Problem::told("a value that depends on the circuit")),
            }
        }
        if let Some(value) = self.model_value(line, rest, key) {
            return Ok((value, multiple));
        }
        Err(self.no_value(line, rest, keyed))
    }

    fn no_value(&mut self, line: &Line<'_>, rest: usize, keyed: Option<syntax::Token>) -> Problem {
        let name = line.word_str(0);
        match keyed.or_else(|| line.word(rest)) {
            Some(token) => Problem {
                told: false,
                span: line.at(token),
                message: format!("the value of {name}, {}, is no number", line.str(token)),
                reason: "a value that could not be read",
                help: match syntax::number_meant(line.str(token)) {
                    Some(meant) => format!("Write `{meant}` if that is what was meant: there is a letter where a digit should be."),
                    None => "Write a number such as 4.7k, an expression in braces, or the name of a parameter or model.".into(),
                },
            },
            None => Problem {
                told: false,
                span: line.span,
                message: format!("{name} has nodes {} and {} but no value", line.word_str(1), line.word_str(2)),
                reason: "no value",
                help: "Write its value behind the two nodes.".into(),
            },
        }
    }

    /// A value whose comma was meant as a decimal point: told, and read as meant.
    pub(super) fn decimal_comma(&mut self, name: &str, span: Span) -> Result<Value, Problem> {
        let text = self.sources().slice(span);
        let meant = text.replace(',', ".");
        let value = syntax::number(meant.as_bytes());
        let finding = Finding::new(
            "decimal-comma",
            Severity::Error,
            span,
            format!("the {text} of {name} is two words to a reader of netlists: a comma separates, it is no decimal point"),
        )
        .label(format!("read here as {meant}"))
        .about(self.here(name))
        .help(format!("Write `{meant}`."))
        .fix(format!("write `{meant}`"), vec![Edit { span, replacement: meant.clone() }]);
        self.tell(finding);
        match value {
            Some(number) => Ok(Value { number: number.value, written: true, span }),
            None => Err(Problem {
                told: false,
                span,
                message: format!("{text} is no number"),
                reason: "a value that could not be read",
                help: "Write a number such as 4.7k.".into(),
            }),
        }
    }

    fn too_few_nodes(&mut self, line: &Line<'_>, letter: u8, nodes: usize) -> Behaviour {
        let name = line.word_str(0);
        let given = line.len().saturating_sub(1);
        let message = format!(
            "{name} has {given} of the {nodes} nodes that an element with the letter {} has",
            char::from(letter)
        );
        let problem = Problem {
            told: false,
            span: line.span,
            message,
            reason: "too few nodes",
            help: "Give every node; until then it counts as an unknown element on the nodes it has.".into(),
        };
        self.unreadable(line, problem)
    }

    /// Tells the problem and keeps the element as unknown on its nodes.
    pub(super) fn unreadable(&mut self, line: &Line<'_>, problem: Problem) -> Behaviour {
        self.circuit.incomplete |= !problem.told;
        if !problem.told {
            let finding = Finding::new("unreadable-line", Severity::Error, problem.span, problem.message)
                .label(problem.reason)
                .about(self.here(line.word_str(0)))
                .help(problem.help);
            self.tell(finding);
        }
        Behaviour::Unknown { reason: problem.reason }
    }

    fn nameless(&mut self, line: &Line<'_>) {
        self.circuit.incomplete = true;
        let finding = Finding::new(
            "unreadable-line",
            Severity::Error,
            line.span,
            "this line begins with no name, so it is no element, no dot line and no comment",
        )
        .label("not read")
        .help("Begin it with an element's name, a dot, + to continue, or * for a comment.");
        self.tell(finding);
    }
}

/// A value times a factor; the factor 1 keeps it as written.
pub(super) fn scaled(value: Value, factor: f64) -> Value {
    #[expect(clippy::float_cmp, reason = "only the exact factor 1 leaves the written number as it is")]
    if factor == 1.0 {
        return value;
    }
    Value { number: value.number * factor, written: false, span: value.span }
}
