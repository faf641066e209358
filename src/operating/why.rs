//! Why a diode is in its state, gathered over all conditions: those that share a state share one line of reasoning.
//! The words are `speaker`'s, the values that would flip the state `search`'s.

use super::assemble::Setting;
use super::evaluate::Solved;
use super::result::{Case, DiodeResult, Reasoning};
use super::search::{Search, flips};
use super::speaker::{self, sentence};
use crate::circuit::{ElementId, State};
use crate::finding::quantity;

/// Gathers the reasoning over the conditions. Conditions with one state share one line of reasoning, told for the
/// first of them; what differs between them is told as a spread.
#[derive(Default)]
pub(crate) struct Reasoner {
    lines: Vec<Line>,
}

/// One line of reasoning and the numbers of the conditions that share it.
struct Line {
    reasoning: Reasoning,
    /// Which of several consistent sets, from 0.
    set: usize,
    has_view: bool,
    not_evaluated: Option<String>,
    currents: Vec<f64>,
    margins: Vec<f64>,
}

impl Reasoner {
    /// Adds one case.
    pub fn add(&mut self, setting: &Setting<'_>, solved: &Solved, case: &Case, element: ElementId) {
        for (set, solution) in case.solutions.iter().enumerate() {
            // diodes stand in the order of their numbers
            let Ok(at) = solution.diodes.binary_search_by_key(&element, |d| d.element) else { continue };
            let diode = &solution.diodes[at];
            if !self.shares(case, set, diode) {
                self.tell(setting, solved, case, set, diode);
            }
        }
        if case.solutions.is_empty() {
            self.nothing(case);
        }
    }

    /// All lines, in the order of their first conditions.
    pub fn finish(self) -> Vec<Reasoning> {
        self.lines.into_iter().map(Line::finish).collect()
    }

    /// Joins the case to a line that reasons alike.
    fn shares(&mut self, case: &Case, set: usize, diode: &DiodeResult) -> bool {
        let alike = |line: &&mut Line| {
            line.reasoning.state == diode.state
                && line.set == set
                && line.has_view == diode.view.is_some()
                && line.not_evaluated == diode.not_evaluated
        };
        let Some(line) = self.lines.iter_mut().find(alike) else { return false };
        line.reasoning.cases.push(case.name.clone());
        line.currents.push(diode.current.known().unwrap_or(f64::NAN));
        line.margins.push(diode.margin.unwrap_or(f64::NAN));
        true
    }

    fn tell(&mut self, setting: &Setting<'_>, solved: &Solved, case: &Case, set: usize, diode: &DiodeResult) {
        let count = case.solutions.len();
        let mut sentences = Vec::new();
        if count > 1 {
            sentences.push(format!("This is set {} of {count} that are consistent.", set + 1));
        }
        sentences.extend(speaker::sentences(setting.circuit, case, diode));
        sentences.extend(speaker::trust(diode));
        let is_single = count == 1 && diode.state != State::NotEvaluated;
        let search = if is_single { flips(setting, solved, diode.element) } else { Search::default() };
        self.lines.push(Line {
            set,
            has_view: diode.view.is_some(),
            not_evaluated: diode.not_evaluated.clone(),
            currents: vec![diode.current.known().unwrap_or(f64::NAN)],
            margins: vec![diode.margin.unwrap_or(f64::NAN)],
            reasoning: Reasoning {
                cases: vec![case.name.clone()],
                state: diode.state,
                flip_sentence: if is_single { search.sentence(diode.state) } else { String::new() },
                sentences,
                flips: search.flips,
            },
        });
    }

    /// A case in which nothing could be solved.
    fn nothing(&mut self, case: &Case) {
        let sentences = case.causes.iter().map(|c| sentence(&c.text)).collect();
        self.lines.push(Line {
            set: 0,
            has_view: false,
            not_evaluated: None,
            currents: Vec::new(),
            margins: Vec::new(),
            reasoning: Reasoning {
                cases: vec![case.name.clone()],
                state: State::NotEvaluated,
                sentences,
                flips: Vec::new(),
                flip_sentence: String::new(),
            },
        });
    }
}

impl Line {
    fn finish(mut self) -> Reasoning {
        let cases = &self.reasoning.cases;
        if cases.len() > 1 && self.reasoning.state != State::NotEvaluated {
            let current = spread(cases, &self.currents);
            let margin = least(cases, &self.margins);
            let parts: Vec<String> = [
                current.map(|(low, high)| format!("its current runs from {low} to {high}")),
                margin.map(|m| format!("the margin is least with {m}")),
            ]
            .into_iter()
            .flatten()
            .collect();
            let first = cases.first().cloned().unwrap_or_default();
            if parts.is_empty() {
                self.reasoning.sentences.push(format!("That was {first}; the others go alike."));
            } else {
                let told = format!("That was {first}; over the conditions named, {}.", parts.join(", and "));
                self.reasoning.sentences.push(told);
            }
        }
        self.reasoning
    }
}

/// Least and greatest with their conditions, where they differ.
fn spread(cases: &[String], values: &[f64]) -> Option<(String, String)> {
    let known = || cases.iter().zip(values).filter(|(_, v)| v.is_finite());
    let (low_case, low) = known().min_by(|a, b| a.1.total_cmp(b.1))?;
    let (high_case, high) = known().max_by(|a, b| a.1.total_cmp(b.1))?;
    let tell = |value: f64, case: &str| format!("{} ({case})", quantity(value, "A"));
    (low < high && quantity(*low, "A") != quantity(*high, "A"))
        .then(|| (tell(*low, low_case), tell(*high, high_case)))
}

fn least(cases: &[String], values: &[f64]) -> Option<String> {
    let known = cases.iter().zip(values).filter(|(_, v)| v.is_finite());
    let (case, value) = known.min_by(|a, b| a.1.total_cmp(b.1))?;
    Some(format!("{} ({case})", quantity(*value, "V")))
}
