//! The states of all diodes for a person: what changes from condition to condition first, a diode that never
//! changes once, what is open as intervals, and for each condition the verdict with its reason.

mod conditions;
mod rows;
#[cfg(test)]
mod tests;

use super::paint::{Page, clean, wrap};
use super::summary::counted;
use crate::analysis::Analysis;
use crate::circuit::{Behaviour, Circuit, ElementId};
use crate::operating::{Operating, Quantity, Solution, State, Verdict};

pub(super) use rows::state_ink;

/// Running text is broken at this width.
const WIDTH: usize = 96;
/// Names of conditions listed in one line.
const NAMES_SHOWN: usize = 12;

/// Writes the states of one file.
pub fn states(page: &mut Page, analysis: &Analysis) {
    let circuit = &analysis.circuit;
    let Some(operating) = &analysis.operating else {
        page.plain("No states were asked for.").end();
        return;
    };
    if circuit.elements.is_empty() {
        page.plain("There are no elements in this file, so there are no states.").end();
        return;
    }
    conditions::write(page, circuit, operating);
    let groups = conditions::groups(operating);
    for group in groups.iter().filter(|g| g.verdict() != Verdict::Unique) {
        group.write(page, circuit, operating.cases.len());
    }
    page.end();
    let views = views(operating);
    let told: Vec<&str> = groups.iter().flat_map(|g| g.causes.iter().copied()).collect();
    rows::tables(page, circuit, &views, &told);
    left_to_time(page, circuit, operating);
    unrefined(page, circuit, operating);
    for group in groups.iter().filter(|g| g.verdict() == Verdict::Unique) {
        group.write(page, circuit, operating.cases.len());
    }
    closing(page, circuit, operating, &views);
}

/// One consistent set of one condition.
struct SetView<'a> {
    name: String,
    solution: &'a Solution,
    /// One of several of its condition.
    is_set: bool,
    /// Diodes that this condition does not judge.
    left_out: &'a [ElementId],
    /// Largest voltage and current in it.
    scale: (f64, f64),
}

fn views(operating: &Operating) -> Vec<SetView<'_>> {
    let mut views = Vec::new();
    for case in &operating.cases {
        for (n, solution) in case.solutions.iter().enumerate() {
            let name = match case.solutions.len() {
                1 => case.name.clone(),
                _ => format!("{} set {}", case.name, n + 1),
            };
            let left_out = if case.instant { &operating.left_to_time[..] } else { &[] };
            let is_set = case.solutions.len() > 1;
            views.push(SetView { name, solution, is_set, left_out, scale: scale(solution) });
        }
    }
    views
}

/// The largest voltage and the largest current of a solution.
fn scale(solution: &Solution) -> (f64, f64) {
    let largest = |values: &mut dyn Iterator<Item = Quantity>| {
        values.filter_map(Quantity::known).map(f64::abs).fold(0.0, f64::max)
    };
    let nodes = solution.nodes.iter().map(|n| n.voltage);
    let diodes = solution.diodes.iter().map(|d| d.voltage);
    let branches = solution.branches.iter().map(|b| b.current);
    let currents = solution.diodes.iter().map(|d| d.current);
    (largest(&mut nodes.chain(diodes)), largest(&mut branches.chain(currents)))
}

/// The first few names, and how many more.
fn some_of(names: &[&str]) -> String {
    let shown = &names[..names.len().min(NAMES_SHOWN)];
    match names.len() - shown.len() {
        0 => shown.join(", "),
        more => format!("{} and {more} more", shown.join(", ")),
    }
}

/// `both conditions`, `all 9 conditions`
pub(super) fn all_conditions(count: usize) -> String {
    if count == 2 { "both conditions".into() } else { format!("all {count} conditions") }
}

fn paragraph(page: &mut Page, indent: &str, text: &str) {
    for line in wrap(text, page.room(WIDTH) - indent.len()) {
        page.plain(indent).plain(&line).end();
    }
}

/// Which diodes the extremes of moving sources say nothing about, where there are such conditions.
fn left_to_time(page: &mut Page, circuit: &Circuit, operating: &Operating) {
    if operating.left_to_time.is_empty() || !operating.cases.iter().any(|c| c.instant) {
        return;
    }
    let names: Vec<String> = operating.left_to_time.iter().map(|&id| circuit.element_name(id)).collect();
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let text = format!(
        "Not judged where a source is greatest or least: {}, which it reaches through a capacitor, an inductor \
         or a coupling.",
        some_of(&names)
    );
    paragraph(page, "", &text);
}

/// Diodes that have no second opinion although it was sought.
fn unrefined(page: &mut Page, circuit: &Circuit, operating: &Operating) {
    let solutions = operating.cases.iter().flat_map(|case| &case.solutions);
    let Some(part) = solutions.flat_map(|s| &s.unrefined).next() else { return };
    let names: Vec<String> = part.diodes.iter().map(|&id| circuit.element_name(id)).collect();
    let names: Vec<&str> = names.iter().map(String::as_str).collect();
    let text = format!("No second opinion by the exponential law on {}: {}.", some_of(&names), part.reason);
    paragraph(page, "", &text);
}

/// `3 diodes: 2 conducting, 1 blocking; 1 condition, 4 factorizations`
fn closing(page: &mut Page, circuit: &Circuit, operating: &Operating, views: &[SetView<'_>]) {
    let diodes = views.first().map_or(&[][..], |v| &v.solution.diodes[..]);
    let states = [State::Conducting, State::Blocking, State::Breakdown, State::Open, State::NotEvaluated];
    let tally: Vec<String> = states
        .into_iter()
        .map(|s| (s, diodes.iter().filter(|d| d.state == s).count()))
        .filter(|&(_, count)| count > 0)
        .map(|(state, count)| format!("{count} {}", state.word()))
        .collect();
    if views.is_empty() {
        // nothing could be solved, so no solution holds them
        let is_diode = |behaviour: &Behaviour| matches!(behaviour, Behaviour::Diode { .. });
        let unsolved = circuit.elements().filter(|(_, e)| is_diode(&e.behaviour)).count();
        page.plain(&counted(unsolved, "diode"));
        if unsolved > 0 {
            page.plain(&format!(": {unsolved} {}", State::NotEvaluated.word()));
        }
    } else {
        page.plain(&counted(diodes.len(), "diode"));
    }
    let solves: usize = operating.cases.iter().map(|c| c.solves).sum();
    if !tally.is_empty() {
        page.plain(": ").plain(&tally.join(", "));
    }
    if let (Some(view), true) = (views.first(), views.len() > 1) {
        page.plain(&format!(" ({})", clean(&view.name)));
    }
    page.plain(&format!("; {}, ", counted(operating.cases.len(), "condition")));
    page.plain(&counted(solves, "factorization")).end();
}
