//! The states of all diodes for a person: what changes from condition to condition first, a diode that never
//! changes once, what is open as intervals, and for each condition the verdict with its reason.

use super::paint::{Ink, Page, clean, wrap};
use super::summary::counted;
use super::table::{self, Cell};
use crate::analysis::Analysis;
use crate::circuit::{Circuit, ElementId};
use crate::finding::{Figure, figure, interval, quantity};
use crate::operating::{Case, DiodeResult, Drop, Interval, Operating, Quantity, Solution, State, Verdict};

/// Running text is broken at this width.
const WIDTH: usize = 96;
/// Sources named in the line of a condition.
const SOURCES_SHOWN: usize = 8;
/// Open quantities listed for a condition.
const OPEN_SHOWN: usize = 12;
/// A number below this share of the largest of its kind is rounding, not an answer.
const ROUNDING: f64 = 1e-12;

/// Writes the states of one file.
pub fn states(page: &mut Page, analysis: &Analysis) {
    let circuit = &analysis.circuit;
    let Some(operating) = &analysis.operating else {
        page.plain("No states were asked for.").end();
        return;
    };
    for case in &operating.cases {
        condition(page, circuit, case);
    }
    let views = views(operating);
    tables(page, circuit, &views);
    closing(page, operating, &views);
}

/// One consistent set of one condition.
struct SetView<'a> {
    name: String,
    solution: &'a Solution,
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
            views.push(SetView { name, solution, left_out, scale: scale(solution) });
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

// ---- conditions ----

/// `nominal   V1 = 12 V, 27 °C`, the verdict, its reasons, and what is open.
fn condition(page: &mut Page, circuit: &Circuit, case: &Case) {
    page.ink(Ink::Strong, &clean(&case.name));
    page.plain("   ").ink(Ink::Faint, &facts(circuit, case)).end();
    page.plain("  ").ink(verdict_ink(case.verdict), case.verdict.word());
    let sentence = verdict_sentence(case);
    for (n, line) in wrap(&sentence, WIDTH - case.verdict.word().len()).iter().enumerate() {
        page.plain(if n == 0 { ": " } else { "    " }).plain(line).end();
    }
    for cause in &case.contradictions {
        for line in wrap(&cause.text, WIDTH) {
            page.plain("    ").plain(&line).end();
        }
    }
    for solution in &case.solutions {
        open_quantities(page, circuit, solution);
    }
    page.end();
}

/// `V1 = 12 V, node +5V = 5 V, 27 °C`
fn facts(circuit: &Circuit, case: &Case) -> String {
    let sources = case.sources.iter().map(|&(id, value)| {
        let unit = if circuit.element(id).letter == b'I' { "A" } else { "V" };
        format!("{} = {}", circuit.element_name(id), quantity(value, unit))
    });
    let supplies = case
        .supplies
        .iter()
        .map(|&(node, volts)| format!("node {} = {}", circuit.node_name(node), quantity(volts, "V")));
    let mut facts: Vec<String> = sources.chain(supplies).collect();
    let more = facts.len().saturating_sub(SOURCES_SHOWN);
    if more > 0 {
        facts.truncate(SOURCES_SHOWN);
        facts.push(format!("{more} more sources"));
    }
    facts.push(format!("{} °C", case.temperature));
    clean(&facts.join(", "))
}

fn verdict_ink(verdict: Verdict) -> Ink {
    match verdict {
        Verdict::Unique => Ink::Live,
        Verdict::None | Verdict::Unverified => Ink::Error,
        _ => Ink::Warning,
    }
}

/// What the verdict means here.
fn verdict_sentence(case: &Case) -> String {
    let proof = format!(
        "put back into the circuit laws it is off by {:.0e} of the largest term",
        case.residual.relative
    );
    match case.verdict {
        Verdict::Unique => format!("one set of states and no other; {proof}"),
        Verdict::Shared => "every voltage is settled; how some currents divide is open".into(),
        Verdict::Floating => "every current is settled; some potentials are open".into(),
        Verdict::SharedFloating => "how some currents divide and some potentials are open".into(),
        Verdict::Several => {
            let at_least = if case.truncated { "at least " } else { "" };
            format!("{at_least}{} sets of states satisfy the circuit laws", case.solutions.len())
        }
        Verdict::Partial => "parts of the circuit could not be evaluated".into(),
        Verdict::None => "no set of states satisfies the circuit laws".into(),
        Verdict::Unverified => {
            "the result does not satisfy the circuit laws closely enough to be shown".into()
        }
    }
}

/// The nodes and branches whose value is open.
fn open_quantities(page: &mut Page, circuit: &Circuit, solution: &Solution) {
    let nodes = solution.nodes.iter().filter_map(|n| {
        n.voltage.interval().map(|i| (format!("node {}", circuit.node_name(n.node)), i, "V"))
    });
    let branches = solution.branches.iter().filter_map(|b| {
        b.current.interval().map(|i| (format!("current of {}", circuit.element_name(b.element)), i, "A"))
    });
    let open: Vec<_> = nodes.chain(branches).collect();
    for (name, Interval { low, high }, unit) in open.iter().take(OPEN_SHOWN) {
        let text = format!("    open: {}  {}", clean(name), interval(*low, *high, unit));
        page.ink(Ink::Warning, &text).end();
    }
    if open.len() > OPEN_SHOWN {
        page.plain(&format!("    and {} more open", open.len() - OPEN_SHOWN)).end();
    }
}

// ---- tables ----

/// One diode over all sets in which it is in one state.
struct Row<'a> {
    results: Vec<(&'a SetView<'a>, &'a DiodeResult)>,
}

fn tables(page: &mut Page, circuit: &Circuit, views: &[SetView<'_>]) {
    let Some(first) = views.first() else { return };
    let count = first.solution.diodes.len();
    let (mut changing, mut steady) = (Vec::new(), Vec::new());
    for n in 0..count {
        let rows = rows_of(views, n);
        if rows.len() > 1 { changing.extend(rows) } else { steady.extend(rows) }
    }
    if !changing.is_empty() {
        page.ink(Ink::Strong, "changes with the condition").end();
        write_rows(page, circuit, &changing, true);
        page.end();
    }
    if !steady.is_empty() {
        if views.len() > 1 {
            let title = format!("the same state in all {} conditions", views.len());
            page.ink(Ink::Strong, &title).end();
        }
        write_rows(page, circuit, &steady, false);
        page.end();
    }
}

/// The `n`th diode, one row for each state it takes, in the order in which they come up.
fn rows_of<'a>(views: &'a [SetView<'a>], n: usize) -> Vec<Row<'a>> {
    let mut rows: Vec<(State, Row<'a>)> = Vec::new();
    for view in views {
        let Some(result) = view.solution.diodes.get(n) else { continue };
        if view.left_out.binary_search(&result.element).is_ok() {
            continue;
        }
        match rows.iter_mut().find(|(state, _)| *state == result.state) {
            Some((_, row)) => row.results.push((view, result)),
            None => rows.push((result.state, Row { results: vec![(view, result)] })),
        }
    }
    rows.into_iter().map(|(_, row)| row).collect()
}

fn write_rows(page: &mut Page, circuit: &Circuit, rows: &[Row<'_>], with_conditions: bool) {
    let mut head = vec!["diode", "state", "current", "voltage", "drop", "drop from", "margin"];
    if with_conditions {
        head.push("in");
    }
    let mut cells: Vec<Vec<Cell>> = rows.iter().map(|row| row.cells(circuit, with_conditions)).collect();
    for n in (1..cells.len()).rev() {
        // a diode of several rows is named once
        if cells[n][0].text == cells[n - 1][0].text {
            cells[n][0].text.clear();
        }
    }
    table::write(page, "  ", &head, &cells);
    for row in rows {
        if let Some((_, DiodeResult { element, not_evaluated: Some(reason), .. })) = row.results.first() {
            let text = format!("{} is not evaluated: {reason}", circuit.element_name(*element));
            for line in wrap(&text, WIDTH) {
                page.plain("  ").ink(Ink::Faint, &line).end();
            }
        }
    }
}

impl Row<'_> {
    fn cells(&self, circuit: &Circuit, with_conditions: bool) -> Vec<Cell> {
        let Some((_, first)) = self.results.first() else { return Vec::new() };
        let known = |scaled: fn(&SetView<'_>) -> f64, of: fn(&DiodeResult) -> Quantity, unit: &str| {
            span_cell(self.results.iter().map(|(v, d)| settle(of(d), scaled(v))), unit)
        };
        let margin = self.results.iter().filter_map(|(_, d)| d.margin).reduce(f64::min);
        let mut cells = vec![
            Cell::word(clean(&circuit.element_name(first.element))),
            Cell::inked(first.state.word(), state_ink(first.state)),
            known(|v| v.scale.1, |d| d.current, "A"),
            known(|v| v.scale.0, |d| d.voltage, "V"),
            drop_cell(self.results.iter().map(|(_, d)| &d.drop)),
            Cell::inked(clean(&first.drop.origin.to_string()), Some(Ink::Faint)),
            margin.map_or_else(Cell::default, |m| figure(m, "V").into()),
        ];
        if with_conditions {
            let names: Vec<String> = self.results.iter().map(|(v, _)| clean(&v.name)).collect();
            cells.push(Cell::word(names.join(", ")));
        }
        cells
    }
}

pub(super) fn state_ink(state: State) -> Option<Ink> {
    match state {
        State::Conducting => Some(Ink::Live),
        State::Blocking => None,
        State::Breakdown => Some(Ink::Reverse),
        State::Open => Some(Ink::Warning),
        State::NotEvaluated => Some(Ink::Faint),
    }
}

/// Rounding is shown as zero.
fn settle(quantity: Quantity, largest: f64) -> Quantity {
    let settled = |v: f64| if v.abs() < ROUNDING * largest { 0.0 } else { v };
    match quantity {
        Quantity::Known(v) => Quantity::Known(settled(v)),
        Quantity::Open(i) => Quantity::Open(Interval { low: settled(i.low), high: settled(i.high) }),
        Quantity::Unknown => Quantity::Unknown,
    }
}

/// All values of a quantity in one cell: one figure, the span of several, or an open interval.
fn span_cell(values: impl Iterator<Item = Quantity>, unit: &str) -> Cell {
    let (mut low, mut high, mut open, mut any) = (f64::INFINITY, f64::NEG_INFINITY, false, false);
    for value in values {
        let (from, to) = match value {
            Quantity::Known(v) => (v, v),
            Quantity::Open(i) => (i.low, i.high),
            Quantity::Unknown => continue,
        };
        open |= matches!(value, Quantity::Open(_));
        any = true;
        (low, high) = (low.min(from), high.max(to));
    }
    match (any, open) {
        (false, _) => Cell::word("-"),
        (_, true) => Cell::inked(format!("open: {}", interval(low, high, unit)), Some(Ink::Warning)),
        _ => between(figure(low, unit), figure(high, unit)),
    }
}

/// `4.10 … 8.30` `mA`
fn between(low: Figure, high: Figure) -> Cell {
    match (low == high, low.unit == high.unit) {
        (true, _) => low.into(),
        (_, true) => Figure { number: format!("{} … {}", low.number, high.number), unit: low.unit }.into(),
        _ => Figure { number: format!("{} {} … {}", low.number, low.unit, high.number), unit: high.unit }
            .into(),
    }
}

fn drop_cell<'a>(drops: impl Iterator<Item = &'a Drop>) -> Cell {
    span_cell(drops.map(|d| Quantity::Known(d.volts)), "V")
}

// ---- end ----

/// `3 diodes: 2 conducting, 1 blocking; 1 condition, 4 factorizations`
fn closing(page: &mut Page, operating: &Operating, views: &[SetView<'_>]) {
    let diodes = views.first().map_or(&[][..], |v| &v.solution.diodes[..]);
    let states = [State::Conducting, State::Blocking, State::Breakdown, State::Open, State::NotEvaluated];
    let tally: Vec<String> = states
        .into_iter()
        .map(|s| (s, diodes.iter().filter(|d| d.state == s).count()))
        .filter(|&(_, count)| count > 0)
        .map(|(state, count)| format!("{count} {}", state.word()))
        .collect();
    let solves: usize = operating.cases.iter().map(|c| c.solves).sum();
    page.plain(&counted(diodes.len(), "diode"));
    if !tally.is_empty() {
        page.plain(": ").plain(&tally.join(", "));
    }
    if let (Some(view), true) = (views.first(), views.len() > 1) {
        page.plain(&format!(" ({})", clean(&view.name)));
    }
    page.plain(&format!("; {}, ", counted(operating.cases.len(), "condition")));
    page.plain(&counted(solves, "factorization")).end();
}
