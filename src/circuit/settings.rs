//! What dot lines set for the whole circuit: temperature, ranges, the span of time, initial voltages.

use super::expand::Expander;
use super::parameter::{Evaluation, Worth};
use super::{Sweep, Transient, Value};
use crate::finding::{Edit, Finding, Severity};
use crate::text::{Span, nearest};

/// Names among which the one that was meant is looked for.
const MOST_CANDIDATES: usize = 2000;

impl Expander<'_> {
    /// Everything but the elements.
    pub(super) fn settings(&mut self) {
        let parsed = self.parsed;
        for setting in &parsed.options {
            let value = match setting.name.as_str() {
                "temp" | "tnom" => self.number(setting.value, "a temperature"),
                _ => None,
            };
            match setting.name.as_str() {
                "temp" if value.is_some() => self.circuit.temperature = value,
                "tnom" if value.is_some() => self.circuit.nominal_temperature = value,
                _ => {}
            }
        }
        if let Some(celsius) = self.overrides.temperature {
            self.circuit.temperature = Some(celsius);
        }
        for words in &parsed.sweeps {
            self.sweep(words);
        }
        if let Some(words) = &parsed.transient {
            self.transient(words);
        }
    }

    /// Root parameters whose value comes from outside the text.
    pub(super) fn preset(&mut self) {
        let overrides = self.overrides;
        for (name, number) in &overrides.parameters {
            let name = name.to_ascii_lowercase();
            if let Some(parameter) = self.frame().parameters.table.get_mut(name.as_str()) {
                let value = Value { number: *number, written: false, span: parameter.value };
                parameter.state = Evaluation::Done(Worth::Is(value));
            }
        }
    }

    /// Initial voltages of the innermost instance.
    pub(super) fn initial_voltages(&mut self) {
        let parsed = self.parsed;
        let block = self.frame().block;
        for &(node, value) in &parsed.blocks[block].initial {
            let found = self.find_node(self.sources.slice(node));
            if found.is_none() {
                self.tell_no_node(node);
            }
            if let (Some(volts), Some(found)) = (self.number(value, "an initial voltage"), found) {
                self.circuit.initial.push((found, volts));
            }
        }
    }

    fn tell_no_node(&mut self, place: Span) {
        let name = self.sources.slice(place);
        let scope = self.frame().scope;
        let here = self.circuit.nodes.iter().filter(|node| node.scope == scope).take(MOST_CANDIDATES);
        let near = nearest(name, here.map(|node| self.circuit.text(node.name))).map(str::to_owned);
        let mut finding = Finding::new(
            "unknown-name",
            Severity::Warning,
            place,
            format!("no node here is named `{name}`, so this initial voltage has no effect"),
        )
        .label("no such node")
        .about(self.here(name))
        .help("Correct the name, or take it out.");
        if let Some(near) = near {
            finding.help = format!("Did you mean `{near}`? As it stands it has no effect.");
            let edit = Edit { span: place, replacement: near.clone() };
            finding = finding.fix(format!("write `{near}`"), vec![edit]);
        }
        self.tell(finding);
    }

    /// A number that a dot line gives; told where it is none.
    fn number(&mut self, place: Span, what: &str) -> Option<f64> {
        let worth = self.worth(place);
        self.judge_slip("", worth);
        match worth {
            Worth::Is(value) => return Some(value.number),
            Worth::Told => return None,
            Worth::Word | Worth::Moving => {}
        }
        let text = self.sources.slice(place);
        let (rule, message, label) = match worth {
            Worth::Moving => (
                "expression-without-value",
                format!("{text} stands where {what} belongs, and depends on what is to be found"),
                "has no value of its own",
            ),
            _ => (
                "unreadable-line",
                format!("{text} stands where {what} belongs, and is no number"),
                "no number",
            ),
        };
        let finding = Finding::new(rule, Severity::Error, place, message)
            .label(label)
            .about(text)
            .help("Write a number, an expression in braces, or the name of a parameter.");
        self.tell(finding);
        None
    }

    /// `dc-line = ".dc" 1*( name from to step )`
    fn sweep(&mut self, words: &[Span]) {
        let mut words = words;
        while let [name, from, to, rest @ ..] = words {
            let ends = (self.number(*from, "the end of a range"), self.number(*to, "the end of a range"));
            if let (Some(from), Some(to)) = ends {
                let span = words.iter().take(4).fold(*name, |all, &w| all.to(w));
                let name = self.sources.slice(*name).to_owned();
                self.circuit.sweeps.push(Sweep { name, from, to, span });
            }
            words = rest.get(1..).unwrap_or_default();
        }
        if let [name, rest @ ..] = words {
            let span = rest.iter().fold(*name, |all, &w| all.to(w));
            let text = self.sources.slice(*name);
            let finding = Finding::new(
                "unreadable-line",
                Severity::Error,
                span,
                format!("the range of {text} lacks its ends"),
            )
            .label("no range")
            .about(text)
            .help("Write what is swept, its two ends and a step: `.dc V1 0 5 0.1`.");
            self.tell(finding);
        }
    }

    /// `tran-line = ".tran" step stop [start [largest]] ["uic"]`
    fn transient(&mut self, words: &[Span]) {
        let uic = words.iter().any(|&w| self.sources.slice(w).eq_ignore_ascii_case("uic"));
        let numbers: Vec<f64> = words.iter().map_while(|&w| self.evaluate(w)).map(|v| v.number).collect();
        let (step, stop) = match numbers.as_slice() {
            [] => return,
            [stop] => (stop / 1000.0, *stop),
            [step, stop, ..] => (*step, *stop),
        };
        let start = numbers.get(2).copied().unwrap_or(0.0);
        self.circuit.transient = Some(Transient { step, stop, start, uic });
    }

    /// Step and stop of `.tran`, for the defaults of source shapes.
    pub(super) fn span_of_time(&self) -> (f64, f64) {
        self.circuit.transient.map_or((1e-6, 1.0), |t| (t.step.max(1e-15), t.stop.max(1e-12)))
    }
}
