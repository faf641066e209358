//! What is wrong with an expression, in words: what cannot be read, what has no value, what is not known. Finding that out
//! is for `parameter`.

use super::expand::Expander;
use super::functions;
use super::parameter::{Context, MOST_OF_FUNCTIONS, Worth};
use crate::finding::{Finding, Severity};
use crate::syntax;
use crate::text::{Span, nearest};
use std::ops::Range;

/// Names among which the one that was meant is looked for.
const MOST_CANDIDATES: usize = 2000;

impl Expander<'_> {
    pub(super) fn tell_unreadable(
        &mut self,
        inner: Span,
        text: &str,
        problem: &syntax::ExpressionProblem,
    ) -> Worth {
        let at = inner.start as usize + problem.at.min(text.len());
        let end = text[problem.at.min(text.len())..].chars().next().map_or(at, |c| at + c.len_utf8());
        let span = Span::new(inner.file, at, end);
        let rule = if problem.is_limit { "limit-reached" } else { "unreadable-expression" };
        let shown: String = text.chars().take(60).collect();
        let finding = Finding::new(
            rule,
            Severity::Error,
            span,
            format!("the expression {shown} cannot be read: {}", problem.what),
        )
        .label(problem.what)
        .help("Mend the expression; until then what it stands for is not evaluated.");
        self.tell(finding);
        Worth::Told
    }

    pub(super) fn tell_functions(&mut self, body: Span) -> Worth {
        let message =
            format!("functions call functions until {MOST_OF_FUNCTIONS} bytes of them are evaluated");
        let finding = Finding::new("limit-reached", Severity::Error, body, message)
            .label("not evaluated any more")
            .help("Break the chain of functions, or write the number.");
        self.tell(finding);
        Worth::Told
    }

    pub(super) fn tell_arguments(
        &mut self,
        context: Context<'_>,
        name: &Range<usize>,
        count: &str,
    ) -> Result<f64, Worth> {
        let text = context.text.get(name.clone()).unwrap_or("");
        let finding = Finding::new(
            "unreadable-expression",
            Severity::Error,
            context.at(name),
            format!("the function {text} takes {count}"),
        )
        .label(format!("takes {count}"))
        .help("Mend the call; until then what the expression stands for is not evaluated.");
        self.tell(finding);
        Err(Worth::Told)
    }

    pub(super) fn tell_unknown(
        &mut self,
        context: Context<'_>,
        name: &Range<usize>,
        is_function: bool,
    ) -> Result<f64, Worth> {
        let text = context.text.get(name.clone()).unwrap_or("");
        let kind = if is_function { "function" } else { "parameter" };
        let near = if is_function {
            nearest(text, functions::FUNCTIONS).map(str::to_owned)
        } else {
            self.near_parameter(context.frame, text)
        };
        let help = match near {
            Some(near) => format!("Did you mean `{near}`? Until it is known, what the expression stands for is not evaluated."),
            None => "Define it with `.param`, or correct the name; until then what the expression stands for is not evaluated.".to_owned(),
        };
        let finding = Finding::new(
            "unknown-parameter",
            Severity::Error,
            context.at(name),
            format!("there is no {kind} {text} here"),
        )
        .label(format!("no such {kind}"))
        .about(text)
        .help(help);
        self.tell(finding);
        Err(Worth::Told)
    }

    pub(super) fn near_parameter(&self, frame: usize, text: &str) -> Option<String> {
        let known: usize = self.frames.iter().map(|f| f.parameters.table.len()).sum();
        if known > MOST_CANDIDATES || self.told.is_full("unknown-parameter") {
            return None;
        }
        let mut names: Vec<&str> =
            self.frames.iter().take(frame + 1).flat_map(|f| f.parameters.table.keys().copied()).collect();
        names.sort_unstable();
        nearest(text, names).map(str::to_owned)
    }

    pub(super) fn tell_cycle(&mut self, name: &str, user: Span) -> Worth {
        let finding = Finding::new(
            "parameter-cycle",
            Severity::Error,
            user,
            format!("the parameter {name} needs its own value to be evaluated"),
        )
        .label("needs itself, directly or through others")
        .about(name)
        .help("Break the circle by giving one of them a number.");
        self.tell(finding);
        Worth::Told
    }

    pub(super) fn tell_no_value(&mut self, name: &str, value: Span) -> Worth {
        let text = self.sources.slice(value);
        let finding = Finding::new(
            "unknown-parameter",
            Severity::Error,
            value,
            format!("the value of parameter {name}, {text}, is no number and no parameter"),
        )
        .label("no value")
        .about(name)
        .help("Write a number, an expression, or the name of a parameter.");
        self.tell(finding);
        Worth::Told
    }
}
