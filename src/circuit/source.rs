//! Independent sources: DC, AC and the shapes over time, with or without parentheses.

use super::behaviour::{Behaviour, Shape, Source, Value};
use super::element::{Problem, Read};
use super::expand::Expander;
use super::line::Line;
use super::parameter::Worth;
use super::value::Quantity;
use crate::finding::{Finding, Severity};
use crate::syntax::{Pair, Token};
use crate::text::Span;

impl Expander<'_> {
    /// `voltage-source = name node node [value] ["DC" value] ["AC" [value [value]]] [shape]`
    pub(super) fn voltage_source(&mut self, line: &Line<'_>, rest: usize) -> Read {
        self.source(line, rest, Quantity::Volts).map(|s| Behaviour::VoltageSource(Box::new(s)))
    }

    /// `current-source`: as a voltage source.
    pub(super) fn current_source(&mut self, line: &Line<'_>, rest: usize) -> Read {
        let multiple = self.multiple(line) * self.copies();
        let mut source = self.source(line, rest, Quantity::Amperes)?;
        source.dc = source.dc.map(|v| super::element::scaled(v, multiple));
        source.ac = source.ac.map(|amperes| amperes * multiple);
        source.shape = source.shape.map(|shape| shape.times(multiple));
        Ok(Behaviour::CurrentSource(Box::new(source)))
    }

    fn source(&mut self, line: &Line<'_>, rest: usize, quantity: Quantity) -> Result<Source, Problem> {
        let mut source = Source::default();
        let mut at = rest;
        if let Some(token) = line.pair("dc") {
            source.dc = Some(self.source_value(line, token, quantity, || no_text(line, token))?);
        }
        if let Some(token) = line.pair("ac") {
            source.ac = self.evaluate(line.at(token)).map(|v| v.number);
        }
        self.tell_unread_pairs(line);
        while let Some(token) = line.word(at) {
            let word = line.str(token);
            if word.eq_ignore_ascii_case("dc") {
                let missing = || no_number(line, at + 1, "behind DC");
                let token = line.word(at + 1).ok_or_else(missing)?;
                source.dc = Some(self.source_value(line, token, quantity, missing)?);
                at += 2;
            } else if word.eq_ignore_ascii_case("ac") {
                let values = self.numbers(line, at + 1, 2)?;
                source.ac = Some(values.first().copied().unwrap_or(1.0));
                at += 1 + values.len();
            } else if let Some(kind) = shape_word(word) {
                let limit = if kind == "pwl" { usize::MAX } else { 8 };
                let values = self.numbers(line, at + 1, limit)?;
                let shape = self.shape(line, at, kind, &values)?;
                source.shape = Some(self.repeated(line, shape));
                if kind == "pwl" {
                    self.judge_times(line, at + 1, &values);
                }
                at += 1 + values.len();
            } else if let Some(range) =
                line.fields.decimal_comma(line.text, at).filter(|_| source.dc.is_none())
            {
                let span = Span { file: line.file(), start: range.0, end: range.1 };
                source.dc = Some(self.decimal_comma(line.word_str(0), span)?);
                at += 2;
            } else if at == rest || source.dc.is_none() {
                let missing = || no_number(line, at, "where its value should stand");
                source.dc = Some(self.source_value(line, token, quantity, missing)?);
                at += 1;
            } else {
                self.tell_surplus_from(line, at);
                break;
            }
        }
        Ok(source)
    }

    fn source_value(
        &mut self,
        line: &Line<'_>,
        token: Token,
        quantity: Quantity,
        missing: impl FnOnce() -> Problem,
    ) -> Result<Value, Problem> {
        match self.value(line, token, quantity) {
            Worth::Is(value) => Ok(value),
            Worth::Word => Err(missing()),
            Worth::Told => Err(Problem::told("a value that could not be evaluated")),
            Worth::Moving => Err(Problem::told("a value that depends on the circuit")),
        }
    }

    /// Up to `limit` numbers from word `at` on.
    fn numbers(&mut self, line: &Line<'_>, at: usize, limit: usize) -> Result<Vec<f64>, Problem> {
        let mut out = Vec::new();
        while out.len() < limit {
            let Some(token) = line.word(at + out.len()) else { break };
            if shape_word(line.str(token)).is_some() || is_keyword(line.str(token)) {
                break;
            }
            let worth = self.worth(line.at(token));
            self.judge_slip(line.word_str(0), worth);
            match worth {
                Worth::Is(value) => out.push(value.number),
                Worth::Word => break,
                // a shape with a hole in it would be another shape
                Worth::Told | Worth::Moving => {
                    return Err(Problem::told("a value that could not be evaluated"));
                }
            }
        }
        Ok(out)
    }

    /// `shape = sine / pulse / points / exponential / modulated`, absent parameters by their defaults.
    fn shape(&mut self, line: &Line<'_>, at: usize, kind: &str, values: &[f64]) -> Result<Shape, Problem> {
        let get = |n: usize, default: f64| values.get(n).copied().unwrap_or(default);
        let need = |count: usize| {
            if values.len() < count { Err(too_few(line, at, count, values.len())) } else { Ok(()) }
        };
        let (step, stop) = self.span_of_time();
        match kind {
            "sin" => need(2).map(|()| Shape::Sine {
                offset: get(0, 0.0),
                amplitude: get(1, 0.0),
                frequency: if get(2, 0.0) > 0.0 { get(2, 0.0) } else { 1.0 / stop },
                delay: get(3, 0.0),
                damping: get(4, 0.0),
                phase: get(5, 0.0),
            }),
            "pulse" => need(2).map(|()| Shape::Pulse {
                low: get(0, 0.0),
                high: get(1, 0.0),
                delay: get(2, 0.0),
                rise: positive(get(3, step), step),
                fall: positive(get(4, step), step),
                width: positive(get(5, stop), stop),
                period: positive(get(6, stop), stop),
            }),
            "exp" => need(2).map(|()| {
                let delay1 = get(2, 0.0);
                let tau1 = positive(get(3, step), step);
                Shape::Exponential {
                    low: get(0, 0.0),
                    high: get(1, 0.0),
                    delay1,
                    tau1,
                    delay2: get(4, delay1 + step),
                    tau2: positive(get(5, step), step),
                }
            }),
            "sffm" => need(2).map(|()| Shape::Modulated {
                offset: get(0, 0.0),
                amplitude: get(1, 0.0),
                carrier: positive(get(2, 1.0 / stop), 1.0 / stop),
                index: get(3, 0.0),
                signal: positive(get(4, 1.0 / stop), 1.0 / stop),
            }),
            _ => points(line, at, values),
        }
    }
}

impl Expander<'_> {
    /// A sign before a time: some readers count such a time from the point before it.
    fn judge_times(&mut self, line: &Line<'_>, first: usize, values: &[f64]) {
        let times =
            (2..values.len()).step_by(2).filter(|&n| values.get(n - 2).is_some_and(|before| *before != 0.0));
        let signed = |n: &usize| line.word_str(first + n).starts_with('+');
        let Some((token, value)) =
            times.filter(signed).find_map(|n| Some((line.word(first + n)?, *values.get(n)?)))
        else {
            return;
        };
        let (name, text) = (line.word_str(0), line.str(token));
        let message = format!(
            "the time {text} of {name} counts from the beginning here, so it is {}; some readers count a time with a + \
             from the point before it",
            crate::finding::quantity(value, "s")
        );
        let finding = Finding::new("misread-value", Severity::Warning, line.at(token), message)
            .label("counts from the beginning")
            .about(self.here(name))
            .help("Write the time from the beginning without a sign, so that every reader takes it alike.");
        self.tell(finding);
    }

    /// Pairs that a source does not have here, in one finding.
    fn tell_unread_pairs(&mut self, line: &Line<'_>) {
        const READ: [&str; 7] = ["dc", "ac", "m", "r", "td", "temp", "tc"];
        let is_unread = |p: &&Pair| !READ.iter().any(|key| line.str(p.key).eq_ignore_ascii_case(key));
        let unread: Vec<Pair> = line.fields.pairs.iter().filter(is_unread).copied().collect();
        let (Some(first), Some(last)) = (unread.first(), unread.last()) else { return };
        let words: Vec<&str> = unread.iter().map(|p| line.str(p.key)).collect();
        let name = line.word_str(0);
        let verb = if words.len() == 1 { "is" } else { "are" };
        let message =
            format!("{} of the source {name} {verb} not read", super::semiconductor::shortened(&words));
        let finding = Finding::new(
            "surplus-word",
            Severity::Note,
            line.at(first.key).to(line.at(last.value)),
            message,
        )
        .label("has no effect")
        .about(self.here(name))
        .help(
            "If it stands for a part, such as a resistance inside of the source, give it a line of its own.",
        );
        self.tell(finding);
    }

    /// `r=` behind points: from that time on they are gone through over and over. Below zero it means not at all.
    fn repeated(&mut self, line: &Line<'_>, shape: Shape) -> Shape {
        let Shape::Points(points) = shape else { return shape };
        if let Some(delay) = line.pair("td") {
            self.tell_no_effect(line, delay, "a PWL shape has no delay here".to_owned());
        }
        let Some(token) = line.pair("r") else { return Shape::Points(points) };
        let last = points.last().map_or(0.0, |p| p.0);
        match self.evaluate(line.at(token)).map(|v| v.number) {
            Some(from) if from >= 0.0 && from < last => return Shape::Repeated { points, from },
            Some(from) if from < 0.0 => {}
            Some(_) => {
                let last = crate::finding::quantity(last, "s");
                self.tell_no_effect(
                    line,
                    token,
                    format!("the shape ends at {last}, so that nothing is left to repeat"),
                );
            }
            None => self.tell_no_effect(line, token, "it has no value here".to_owned()),
        }
        Shape::Points(points)
    }

    fn tell_no_effect(&mut self, line: &Line<'_>, token: Token, why: String) {
        let (name, text) = (line.word_str(0), line.str(token));
        let message = format!("the {text} behind the PWL shape of {name} has no effect: {why}");
        let finding = Finding::new("surplus-word", Severity::Warning, line.at(token), message)
            .label("has no effect")
            .about(self.here(name))
            .help("Give the times themselves; `r=` takes the time, before the last, from which the points repeat.");
        self.tell(finding);
    }
}

/// `points = "PWL" 1*( time value )`
fn points(line: &Line<'_>, at: usize, values: &[f64]) -> Result<Shape, Problem> {
    if values.len() < 2 {
        return Err(too_few(line, at, 2, values.len()));
    }
    let (pairs, odd) = values.as_chunks::<2>();
    let points: Vec<(f64, f64)> = pairs.iter().map(|&[t, v]| (t, v)).collect();
    let problem = |message: String| Problem {
        told: false,
        span: line.word(at).map_or(line.span, |t| line.at(t)),
        message,
        reason: "a shape that could not be read",
        help: "Give pairs of time and value, times ascending.".into(),
    };
    if !odd.is_empty() {
        return Err(problem(format!(
            "the PWL shape of {} has a time without a value at its end",
            line.word_str(0)
        )));
    }
    if let Some(pair) = points.windows(2).find(|w| w[1].0 < w[0].0) {
        let text = format!(
            "the PWL shape of {} goes back in time, from {:e} s to {:e} s",
            line.word_str(0),
            pair[0].0,
            pair[1].0
        );
        return Err(problem(text));
    }
    Ok(Shape::Points(points))
}

fn positive(value: f64, default: f64) -> f64 {
    if value > 0.0 { value } else { default }
}

/// The shape that a misspelt word comes nearest to.
fn near_shape(word: &str) -> Option<&'static str> {
    crate::text::nearest(word, ["SIN", "PULSE", "PWL", "EXP", "SFFM"])
}

fn shape_word(word: &str) -> Option<&'static str> {
    ["sin", "pulse", "pwl", "exp", "sffm"].into_iter().find(|s| word.eq_ignore_ascii_case(s))
}

fn is_keyword(word: &str) -> bool {
    word.eq_ignore_ascii_case("dc") || word.eq_ignore_ascii_case("ac")
}

fn no_number(line: &Line<'_>, word: usize, place: &str) -> Problem {
    let text = line.word_str(word);
    Problem {
        told: false,
        span: line.word(word).map_or(line.span, |t| line.at(t)),
        message: match text {
            "" => format!("{} has no number {place}", line.word_str(0)),
            _ => format!("{} has {text} {place}, which is no number", line.word_str(0)),
        },
        reason: "a value that could not be read",
        help: match near_shape(text) {
            Some(near) => format!("Did you mean `{near}`?"),
            None => "Write a value, DC and a value, or a shape such as `SIN(0 5 50)`.".into(),
        },
    }
}

fn no_text(line: &Line<'_>, token: Token) -> Problem {
    Problem {
        told: false,
        span: line.at(token),
        message: format!("the value of {}, {}, is no number", line.word_str(0), line.str(token)),
        reason: "a value that could not be read",
        help: "Write a number such as 5 or an expression in braces.".into(),
    }
}

fn too_few(line: &Line<'_>, at: usize, count: usize, given: usize) -> Problem {
    let numbers = if given == 1 { "1 number" } else { &format!("{given} numbers") };
    let stop = match line.word_str(at + 1 + given) {
        "" => String::new(),
        word => format!(" before {word}"),
    };
    Problem {
        told: false,
        span: line.word(at).map_or(line.span, |t| line.at(t)),
        message: format!(
            "the {} shape of {} has {numbers}{stop} and needs at least {count}",
            line.word_str(at),
            line.word_str(0)
        ),
        reason: "a shape that could not be read",
        help: "Complete the shape's parameters.".into(),
    }
}
