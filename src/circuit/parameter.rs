//! Parameters and the evaluation of expressions. Parameters are looked up in the instance and then in those that
//! hold it, outwards to the root; each is evaluated when first asked for, which is how cycles are found.

use super::behaviour::Value;
use super::expand::Expander;
use super::functions::{self, Called};
use super::parsed::Setting;
use crate::finding::{Finding, Severity};
use crate::syntax::{self, Binary, Expression};
use crate::text::Span;
use rustc_hash::FxHashMap;
use std::ops::Range;

/// What a text is worth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Worth {
    Is(Value),
    /// A plain word that is neither a number nor a parameter.
    Word,
    /// It depends on voltages, currents or time.
    Moving,
    /// It has no value, and a finding says why.
    Told,
}

impl Worth {
    pub fn value(self) -> Option<Value> {
        if let Worth::Is(value) = self { Some(value) } else { None }
    }
}

/// Names known in one instance.
#[derive(Debug, Default)]
pub(super) struct Scope<'a> {
    pub table: FxHashMap<&'a str, Parameter>,
}

#[derive(Debug, Clone, Copy)]
pub(super) struct Parameter {
    pub value: Span,
    /// Number of the frame in which the value is to be evaluated.
    pub frame: usize,
    pub state: Evaluation,
}

impl Parameter {
    /// Whether something needed its value.
    pub fn was_asked(&self) -> bool {
        !matches!(self.state, Evaluation::Waiting)
    }
}

#[derive(Debug, Clone, Copy)]
pub(super) enum Evaluation {
    Waiting,
    Running,
    Done(Worth),
}

/// Parameters that need parameters, and expressions within them.
const DEEPEST: usize = 400;
/// Bytes of function bodies that are evaluated in all: forty functions that each call another twice would take longer
/// than anyone lives. Fewer in tests, which must be quick.
pub(super) const MOST_OF_FUNCTIONS: usize = if cfg!(test) { 1 << 20 } else { 100 << 20 };

/// An expression under evaluation: where its text stands and in which frame it is looked at.
#[derive(Clone, Copy)]
pub(super) struct Context<'t> {
    pub(super) text: &'t str,
    inner: Span,
    pub(super) frame: usize,
    /// Arguments of the function whose body this is.
    bound: Option<(&'t [String], &'t [f64])>,
}

impl Context<'_> {
    pub(super) fn at(&self, range: &Range<usize>) -> Span {
        let start = self.inner.start as usize;
        Span::new(self.inner.file, start + range.start, start + range.end)
    }
}

impl<'a> Expander<'a> {
    /// The value of the text under a span, seen from the innermost instance; findings told where it has none.
    pub(super) fn evaluate(&mut self, span: Span) -> Option<Value> {
        let worth = self.worth(span);
        self.judge_slip("", worth);
        worth.value()
    }

    pub(super) fn worth(&mut self, span: Span) -> Worth {
        let frame = self.frames.len().saturating_sub(1);
        self.worth_in(frame, span, false)
    }

    /// What the text under a span is worth, seen from frame `frame`. `strict`: it cannot be anything but a value;
    /// else a text without braces whose names are no parameters is a word (a model's name may hold a minus).
    pub(super) fn worth_in(&mut self, frame: usize, span: Span, strict: bool) -> Worth {
        let text = self.sources.slice(span);
        if let Some(number) = syntax::number(text.as_bytes()) {
            return Worth::Is(Value { number: number.value, written: true, span });
        }
        let Some((inner, delimited)) = inside(text, span) else { return Worth::Word };
        let text = self.sources.slice(inner);
        if let Some(number) = syntax::number(text.trim().as_bytes()) {
            return Worth::Is(Value { number: number.value, written: true, span: trimmed(text, inner) });
        }
        let strict = strict || delimited;
        let tree = match syntax::expression(text) {
            Ok(tree) if strict || self.knows_all(frame, text, &tree) => tree,
            Ok(_) => return Worth::Word,
            Err(problem) if !strict && !problem.is_limit => return Worth::Word,
            Err(problem) => return self.tell_unreadable(inner, text, &problem),
        };
        let context = Context { text, inner, frame, bound: None };
        if let Expression::Name(name) = &tree {
            return self.name(context, name);
        }
        match self.tree(context, &tree) {
            Ok(number) => Worth::Is(Value { number, written: false, span }),
            Err(worth) => worth,
        }
    }

    fn tree(&mut self, context: Context<'_>, tree: &Expression) -> Result<f64, Worth> {
        self.depth += 1;
        if self.depth > DEEPEST {
            self.depth -= 1;
            let finding = Finding::new(
                "limit-reached",
                Severity::Error,
                context.inner,
                format!("this expression needs more than {DEEPEST} others within each other"),
            )
            .label("too deep to evaluate")
            .help("Break the chain of parameters, or write the number.");
            self.tell(finding);
            return Err(Worth::Told);
        }
        let result = self.node_of_tree(context, tree);
        self.depth -= 1;
        result
    }

    fn node_of_tree(&mut self, context: Context<'_>, tree: &Expression) -> Result<f64, Worth> {
        match tree {
            Expression::Number(number, place) => {
                self.judge_number("", context.at(place));
                Ok(*number)
            }
            Expression::Name(name) => self.name(context, name).value_or_self(),
            Expression::Negative(inner) => Ok(-self.tree(context, inner)?),
            Expression::Not(inner) => Ok(f64::from(self.tree(context, inner)? == 0.0)),
            Expression::Choice(condition, yes, no) => {
                let branch = if self.tree(context, condition)? == 0.0 { no } else { yes };
                self.tree(context, branch)
            }
            Expression::Two(operator, place, left, right) => self.two(context, *operator, place, left, right),
            Expression::Call(name, arguments) => self.call(context, name, arguments),
        }
    }

    fn two(
        &mut self,
        context: Context<'_>,
        operator: Binary,
        place: &Range<usize>,
        left: &Expression,
        right: &Expression,
    ) -> Result<f64, Worth> {
        let x = self.tree(context, left)?;
        let y = self.tree(context, right)?;
        if y == 0.0 && matches!(operator, Binary::Divide | Binary::Remainder) {
            let finding = Finding::new(
                "division-by-zero",
                Severity::Error,
                context.at(place),
                format!("{} divides by zero", context.text.trim()),
            )
            .label("what stands behind this is 0")
            .help(
                "What the expression stands for is not evaluated; correct the parameter that makes it zero.",
            );
            self.tell(finding);
            return Err(Worth::Told);
        }
        self.finite(context, place, apply(operator, x, y))
    }

    fn finite(&mut self, context: Context<'_>, place: &Range<usize>, value: f64) -> Result<f64, Worth> {
        if value.is_finite() {
            return Ok(value);
        }
        let what = if value.is_nan() { "has no value there" } else { "is beyond all numbers" };
        let finding = Finding::new(
            "expression-without-value",
            Severity::Error,
            context.at(place),
            format!("{} {what}", context.text.trim()),
        )
        .label(what)
        .help("What the expression stands for is not evaluated; look at the values that go in.");
        self.tell(finding);
        Err(Worth::Told)
    }

    fn call(
        &mut self,
        context: Context<'_>,
        name: &Range<usize>,
        arguments: &[Expression],
    ) -> Result<f64, Worth> {
        let text = context.text.get(name.clone()).unwrap_or("");
        // only the branch that is taken is evaluated, so that the other may divide by zero
        if let ([condition, yes, no], true) = (arguments, text.eq_ignore_ascii_case("if")) {
            let branch = if self.tree(context, condition)? == 0.0 { no } else { yes };
            return self.tree(context, branch);
        }
        if text.eq_ignore_ascii_case("v") || text.eq_ignore_ascii_case("i") {
            return Err(Worth::Moving);
        }
        let mut values = Vec::with_capacity(arguments.len());
        for argument in arguments {
            values.push(self.tree(context, argument)?);
        }
        if let Some(function) = self.parsed.functions.get(text.to_ascii_lowercase().as_str()) {
            let body = self.sources.slice(function.body);
            return match inside(body, function.body) {
                Some((inner, _)) if function.arguments.len() == values.len() => {
                    self.body_of_function(context, inner, (&function.arguments, &values))
                }
                _ => self.tell_arguments(context, name, &format!("{} arguments", function.arguments.len())),
            };
        }
        match functions::call(text, &values) {
            Called::Value(value) => self.finite(context, name, value),
            Called::Moving => Err(Worth::Moving),
            Called::Arguments(count) => self.tell_arguments(context, name, count),
            Called::Unknown => self.tell_unknown(context, name, true),
        }
    }

    fn body_of_function(
        &mut self,
        context: Context<'_>,
        inner: Span,
        bound: (&[String], &[f64]),
    ) -> Result<f64, Worth> {
        let text = self.sources.slice(inner);
        self.of_functions += text.len() + 1;
        if self.of_functions > MOST_OF_FUNCTIONS {
            return Err(self.tell_functions(inner));
        }
        match syntax::expression(text) {
            Ok(tree) => self.tree(Context { text, inner, frame: context.frame, bound: Some(bound) }, &tree),
            Err(problem) => Err(self.tell_unreadable(inner, text, &problem)),
        }
    }

    /// The worth of a parameter, a function's argument or a constant.
    fn name(&mut self, context: Context<'_>, range: &Range<usize>) -> Worth {
        let text = context.text.get(range.clone()).unwrap_or("");
        let name = text.to_ascii_lowercase();
        let constant = |number: f64| Worth::Is(Value { number, written: false, span: context.at(range) });
        if let Some((names, values)) = context.bound
            && let Some(at) = names.iter().position(|n| *n == name)
        {
            return constant(values.get(at).copied().unwrap_or(f64::NAN));
        }
        if let Some(holder) = self.holder(context.frame, &name) {
            return self.parameter(holder, &name, context.at(range));
        }
        match name.as_str() {
            "pi" => constant(std::f64::consts::PI),
            "e" => constant(std::f64::consts::E),
            "true" | "yes" => constant(1.0),
            "false" | "no" => constant(0.0),
            "temper" | "temp" => constant(self.circuit.temperature.unwrap_or(27.0)),
            "time" | "hertz" | "freq" => Worth::Moving,
            _ => self.tell_unknown(context, range, false).err().unwrap_or(Worth::Told),
        }
    }

    /// Whether every name in an expression is a parameter, and there is one.
    fn knows_all(&self, frame: usize, text: &str, tree: &Expression) -> bool {
        match tree {
            Expression::Number(..) => true,
            Expression::Name(name) => {
                let name = text.get(name.clone()).unwrap_or("").to_ascii_lowercase();
                self.holder(frame, &name).is_some() || matches!(name.as_str(), "pi" | "temper")
            }
            Expression::Negative(x) | Expression::Not(x) => self.knows_all(frame, text, x),
            Expression::Two(_, _, x, y) => self.knows_all(frame, text, x) && self.knows_all(frame, text, y),
            Expression::Choice(c, x, y) => [c, x, y].iter().all(|t| self.knows_all(frame, text, t)),
            Expression::Call(_, arguments) => arguments.iter().all(|t| self.knows_all(frame, text, t)),
        }
    }

    /// Whether a word is a parameter's name here.
    pub(super) fn is_parameter(&self, word: &str) -> bool {
        self.holder(self.frames.len().saturating_sub(1), &word.to_ascii_lowercase()).is_some()
    }

    /// The innermost frame from `frame` outwards that has a parameter of that lower-case name.
    fn holder(&self, frame: usize, name: &str) -> Option<usize> {
        (0..=frame).rev().find(|&f| self.frames.get(f).is_some_and(|f| f.parameters.table.contains_key(name)))
    }

    fn parameter(&mut self, holder: usize, name: &str, user: Span) -> Worth {
        let Some(parameter) = self.frames.get_mut(holder).and_then(|f| f.parameters.table.get_mut(name))
        else {
            return Worth::Told;
        };
        match parameter.state {
            Evaluation::Done(worth) => return worth,
            Evaluation::Running => return self.tell_cycle(name, user),
            Evaluation::Waiting => parameter.state = Evaluation::Running,
        }
        let Parameter { value, frame, .. } = *parameter;
        let worth = match self.worth_in(frame, value, true) {
            Worth::Word => self.tell_no_value(name, value),
            other => other,
        };
        self.judge_slip(name, worth);
        if let Some(parameter) = self.frames.get_mut(holder).and_then(|f| f.parameters.table.get_mut(name)) {
            parameter.state = Evaluation::Done(worth);
        }
        worth
    }
}

impl Worth {
    fn value_or_self(self) -> Result<f64, Worth> {
        match self {
            Worth::Is(value) => Ok(value.number),
            other => Err(other),
        }
    }
}

/// Parameters of a block's settings, to be evaluated in frame `frame`; the last of a name counts.
pub(super) fn declare<'a>(scope: &mut Scope<'a>, settings: &'a [Setting], frame: usize) {
    for setting in settings {
        let parameter = Parameter { value: setting.value, frame, state: Evaluation::Waiting };
        scope.table.insert(&setting.name, parameter);
    }
}

fn apply(operator: Binary, x: f64, y: f64) -> f64 {
    let truth = |b: bool| f64::from(u8::from(b));
    #[expect(clippy::float_cmp, reason = "the language compares numbers exactly")]
    match operator {
        Binary::Or => truth(x != 0.0 || y != 0.0),
        Binary::And => truth(x != 0.0 && y != 0.0),
        Binary::Equal => truth(x == y),
        Binary::Unequal => truth(x != y),
        Binary::Less => truth(x < y),
        Binary::LessOrEqual => truth(x <= y),
        Binary::Greater => truth(x > y),
        Binary::GreaterOrEqual => truth(x >= y),
        Binary::Add => x + y,
        Binary::Subtract => x - y,
        Binary::Multiply => x * y,
        Binary::Divide => x / y,
        Binary::Remainder => x % y,
        Binary::Power => x.powf(y),
    }
}

/// The expression inside braces or quotes, or the whole text, and whether it can be nothing but an expression (what
/// stands in double quotes may be a maker's name); `None` where there is nothing.
fn inside(text: &str, span: Span) -> Option<(Span, bool)> {
    let delimited = text.len() >= 2
        && matches!(
            (text.as_bytes().first(), text.as_bytes().last()),
            (Some(b'{'), Some(b'}')) | (Some(b'\''), Some(b'\'')) | (Some(b'"'), Some(b'"'))
        );
    if text.is_empty() {
        return None;
    }
    if delimited {
        Some((Span { start: span.start + 1, end: span.end - 1, ..span }, !text.starts_with('"')))
    } else {
        Some((span, false))
    }
}

/// The span without the blanks at its ends.
fn trimmed(text: &str, span: Span) -> Span {
    let start = text.len() - text.trim_start().len();
    let end = text.trim_end().len();
    Span::new(span.file, span.start as usize + start, span.start as usize + end.max(start))
}
