//! What dot lines set for the whole circuit: temperature, ranges, the span of time, initial voltages.

use super::expand::Expander;
use super::parameter::{Evaluation, Worth};
use super::{Sweep, Transient, Value};
use crate::text::Span;

impl Expander<'_> {
    /// Everything but the elements.
    pub(super) fn settings(&mut self) {
        let parsed = self.parsed;
        for setting in &parsed.options {
            let value = match setting.name.as_str() {
                "temp" | "tnom" => self.evaluate(setting.value).map(|v| v.number),
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
            let node = self.find_node(self.sources.slice(node));
            if let (Some(node), Some(value)) = (node, self.evaluate(value)) {
                self.circuit.initial.push((node, value.number));
            }
        }
    }

    /// `dc-line = ".dc" 1*( name from to step )`
    fn sweep(&mut self, words: &[Span]) {
        let mut words = words;
        while let [name, from, to, rest @ ..] = words {
            let (from, to) = (self.evaluate(*from), self.evaluate(*to));
            if let (Some(from), Some(to)) = (from, to) {
                let span = words.iter().take(4).fold(*name, |all, &w| all.to(w));
                let name = self.sources.slice(*name).to_owned();
                self.circuit.sweeps.push(Sweep { name, from: from.number, to: to.number, span });
            }
            words = rest.get(1..).unwrap_or_default();
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
