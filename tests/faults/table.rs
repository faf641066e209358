//! The table: operator, mutants, equivalent, intent, caught, share, and the mean over operators.

use super::judge::Judgement;
use super::mutate::{ORIENTATION, VALUE, WIRING};
use std::fmt::Write as _;

/// What became of one mutant.
#[derive(Debug, Clone)]
pub struct Outcome {
    pub operator: &'static str,
    pub judgement: Judgement,
    pub caught: bool,
    /// The file carries expect, range, watch or rating notes.
    pub noted: bool,
}

/// Counts of one row.
#[derive(Debug, Clone, Copy, Default)]
pub struct Row {
    pub mutants: usize,
    pub equivalent: usize,
    pub intent: usize,
    pub caught: usize,
}

impl Row {
    pub fn of<'a>(outcomes: impl Iterator<Item = &'a Outcome>) -> Row {
        let mut row = Row::default();
        for outcome in outcomes {
            row.mutants += 1;
            match outcome.judgement {
                Judgement::Equivalent => row.equivalent += 1,
                Judgement::Intent => row.intent += 1,
                Judgement::Mistake => row.caught += usize::from(outcome.caught),
            }
        }
        row
    }

    /// How many are mistakes.
    pub fn mistakes(&self) -> usize {
        self.mutants - self.equivalent - self.intent
    }

    /// Caught among those that are mistakes; none where there are none, so that no share is over nothing.
    pub fn share(&self) -> f64 {
        self.caught as f64 / self.mistakes().max(1) as f64
    }
}

/// Row of one operator.
pub fn row(outcomes: &[Outcome], operator: &str) -> Row {
    Row::of(outcomes.iter().filter(|o| o.operator == operator))
}

/// The value and intent group in files with notes: caught, and how many there are. Mistakes alone, or with those that
/// only change the intent (a capacitor a thousand times as large leaves every state at rest as it was).
pub fn noted_share(outcomes: &[Outcome], with_intent: bool) -> (usize, usize) {
    let counts = |o: &&Outcome| {
        o.noted
            && VALUE.contains(&o.operator)
            && match o.judgement {
                Judgement::Equivalent => false,
                Judgement::Intent => with_intent,
                Judgement::Mistake => true,
            }
    };
    let ours: Vec<&Outcome> = outcomes.iter().filter(counts).collect();
    (ours.iter().filter(|o| o.caught).count(), ours.len())
}

/// The whole table as text.
pub fn table(outcomes: &[Outcome]) -> String {
    let mut text = format!(
        "{:<28}{:>8}{:>12}{:>8}{:>8}{:>8}\n",
        "operator", "mutants", "equivalent", "intent", "caught", "share"
    );
    let mut shares = Vec::new();
    for (group, operators) in
        [("wiring", &WIRING[..]), ("orientation", &ORIENTATION[..]), ("value and intent", &VALUE[..])]
    {
        let _ = writeln!(text, "-- {group}");
        for operator in operators {
            let row = row(outcomes, operator);
            shares.push(row.share());
            let _ = writeln!(
                text,
                "{operator:<28}{:>8}{:>12}{:>8}{:>8}{:>7.1}%",
                row.mutants,
                row.equivalent,
                row.intent,
                row.caught,
                100.0 * row.share()
            );
        }
    }
    let mean = shares.iter().sum::<f64>() / shares.len() as f64;
    let _ = writeln!(text, "mean over operators {:.1}%", 100.0 * mean);
    for (with_intent, which) in [(false, "mistakes"), (true, "with those of intent only")] {
        let (caught, all) = noted_share(outcomes, with_intent);
        let _ = writeln!(text, "value and intent in files with notes, {which}: {caught} of {all} caught");
    }
    text
}
