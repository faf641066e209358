//! The tables: one row for each diode and each state that it takes, with the span of its values.

use super::super::paint::{Ink, Page, clean, wrap};
use super::super::table::{self, Cell};
use super::{SetView, WIDTH, some_of};
use crate::circuit::Circuit;
use crate::finding::{Figure, figure, interval};
use crate::operating::{DiodeResult, Drop, Interval, Quantity, State, Trust};

/// A number below this share of the largest of its kind is rounding, not an answer.
const ROUNDING: f64 = 1e-12;
/// The least current by the exponential law that is told as a figure, amperes.
const LEAST_REFINED: f64 = 1e-12;

/// One diode over all sets in which it is in one state.
struct Row<'a> {
    results: Vec<(&'a SetView<'a>, &'a DiodeResult)>,
}

/// All diodes; `told` are reasons that stand above already.
pub(super) fn tables(page: &mut Page, circuit: &Circuit, views: &[SetView<'_>], told: &[&str]) {
    let Some(first) = views.first() else { return };
    let count = first.solution.diodes.len();
    let (mut changing, mut steady) = (Vec::new(), Vec::new());
    for n in 0..count {
        let rows = rows_of(views, n);
        if rows.len() > 1 { changing.extend(rows) } else { steady.extend(rows) }
    }
    let title =
        if views.iter().any(|v| v.is_set) { "changes from set to set" } else { "changes with the condition" };
    if !changing.is_empty() {
        page.ink(Ink::Strong, title).end();
        write_rows(page, circuit, &changing, true, told);
        page.end();
    }
    if !steady.is_empty() {
        if views.len() > 1 {
            page.ink(
                Ink::Strong,
                if views.iter().any(|v| v.is_set) {
                    "the same state in every set"
                } else {
                    "the same state in every condition"
                },
            )
            .end();
        }
        write_rows(page, circuit, &steady, false, told);
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

fn write_rows(page: &mut Page, circuit: &Circuit, rows: &[Row<'_>], with_conditions: bool, told: &[&str]) {
    let refined = rows.iter().any(|row| row.results.iter().any(|(_, d)| d.refined.is_some()));
    let trust = rows.iter().any(|row| row.results.iter().any(|(_, d)| d.trust.is_some()));
    let mut head = vec!["diode", "state", "current"];
    head.extend(refined.then_some("refined"));
    head.extend(["voltage", "drop", "drop from", "margin"]);
    head.extend(trust.then_some("trust"));
    if with_conditions {
        head.push("in");
    }
    let mut cells: Vec<Vec<Cell>> =
        rows.iter().map(|row| row.cells(circuit, with_conditions, refined, trust)).collect();
    for n in (1..cells.len()).rev() {
        // a diode of several rows is named once
        if cells[n][0].text == cells[n - 1][0].text {
            cells[n][0].text.clear();
        }
    }
    table::write(page, "  ", &head, &cells);
    unevaluated(page, circuit, rows, told);
    doubts(page, circuit, rows);
}

/// Diodes whose doubts are told one by one.
const DOUBTS_SHOWN: usize = 5;

/// Why trust is less than good, a line for each diode that says something new.
fn doubts(page: &mut Page, circuit: &Circuit, rows: &[Row<'_>]) {
    let mut lines: Vec<(Trust, Vec<String>, String, &str)> = Vec::new();
    for row in rows {
        let worst = row.results.iter().filter(|(_, d)| d.trust.is_some()).min_by_key(|(_, d)| d.trust);
        let Some((view, result)) = worst else { continue };
        if let (Some(trust), Some(reason)) = (result.trust, result.trust_reasons.first()) {
            let name = circuit.element_name(result.element);
            let at = if row.results.len() > 1 { format!(" ({})", view.name) } else { String::new() };
            // what several have in common is told once
            match lines.iter_mut().find(|l| l.0 == trust && l.2 == at && l.3 == reason) {
                Some((_, names, ..)) => names.push(name),
                None => lines.push((trust, vec![name], at, reason)),
            }
        }
    }
    lines.sort_by_key(|(trust, ..)| *trust);
    let more: usize = lines.iter().skip(DOUBTS_SHOWN).map(|(_, names, ..)| names.len()).sum();
    for (trust, names, at, reason) in lines.iter().take(DOUBTS_SHOWN) {
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        let line = format!("{} {}{at}: {reason}", some_of(&names), trust.word());
        for (n, part) in wrap(&clean(&line), page.room(WIDTH) - 4).iter().enumerate() {
            page.plain(if n == 0 { "  " } else { "    " }).ink(Ink::Faint, part).end();
        }
    }
    if more > 0 {
        page.plain("  ").ink(Ink::Faint, &format!("and {more} more that are less than good")).end();
    }
}

/// The diodes that were not evaluated, by reason; `told` are reasons that stand above already.
fn unevaluated(page: &mut Page, circuit: &Circuit, rows: &[Row<'_>], told: &[&str]) {
    let mut reasons: Vec<(&str, Vec<String>)> = Vec::new();
    for (_, result) in rows.iter().filter_map(|row| row.results.first()) {
        let Some(reason) = result.not_evaluated.as_deref().filter(|r| !told.contains(r)) else { continue };
        let name = circuit.element_name(result.element);
        match reasons.iter_mut().find(|(known, _)| *known == reason) {
            Some((_, names)) => names.push(name),
            None => reasons.push((reason, vec![name])),
        }
    }
    for (reason, names) in reasons {
        let names: Vec<&str> = names.iter().map(String::as_str).collect();
        let verb = if names.len() == 1 { "is" } else { "are" };
        for line in wrap(&format!("{} {verb} not evaluated: {reason}", some_of(&names)), page.room(WIDTH)) {
            page.plain("  ").ink(Ink::Faint, &line).end();
        }
    }
}

impl Row<'_> {
    fn cells(&self, circuit: &Circuit, with_conditions: bool, refined: bool, trust: bool) -> Vec<Cell> {
        let Some((_, first)) = self.results.first() else { return Vec::new() };
        let known = |scaled: fn(&SetView<'_>) -> f64, of: fn(&DiodeResult) -> Quantity, unit: &str| {
            span_cell(self.results.iter().map(|(v, d)| settle(of(d), scaled(v))), unit)
        };
        let margin = self.results.iter().filter_map(|(_, d)| d.margin).reduce(f64::min);
        let mut cells = vec![
            Cell::word(clean(&circuit.element_name(first.element))),
            Cell::inked(first.state.word(), state_ink(first.state)),
            known(|v| v.scale.1, |d| d.current, "A"),
        ];
        if refined {
            cells.push(refined_cell(self.results.iter().filter_map(|(_, d)| d.refined).map(|r| r.current)));
        }
        cells.extend([
            known(|v| v.scale.0, |d| d.voltage, "V"),
            drop_cell(self.results.iter().map(|(_, d)| &d.drop)),
            Cell::inked(clean(&first.drop.origin.to_string()), Some(Ink::Faint)),
            margin.map_or_else(Cell::default, |m| figure(m, "V").into()),
        ]);
        if trust {
            let worst = self.results.iter().filter_map(|(_, d)| d.trust).min();
            cells.push(worst.map_or_else(Cell::default, |t| Cell::inked(t.word(), trust_ink(t))));
        }
        if with_conditions {
            let names: Vec<&str> = self.results.iter().map(|(v, _)| v.name.as_str()).collect();
            cells.push(Cell::word(clean(&some_of(&names))));
        }
        cells
    }
}

pub(in crate::report) fn state_ink(state: State) -> Option<Ink> {
    match state {
        State::Conducting => Some(Ink::Live),
        State::Blocking => None,
        State::Breakdown => Some(Ink::Reverse),
        State::Open => Some(Ink::Warning),
        State::NotEvaluated => Some(Ink::Faint),
    }
}

fn trust_ink(trust: Trust) -> Option<Ink> {
    match trust {
        Trust::Good => None,
        Trust::Fair => Some(Ink::Faint),
        Trust::Poor => Some(Ink::Warning),
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

/// Currents by the exponential law. Beneath a picoampere it tells nothing that a board would show: there surfaces leak
/// more.
fn refined_cell(currents: impl Iterator<Item = f64>) -> Cell {
    let told: Vec<f64> = currents.collect();
    if !told.is_empty() && told.iter().all(|i| i.abs() < LEAST_REFINED) && told.iter().any(|i| *i != 0.0) {
        return Figure { number: "< 1".into(), unit: "pA".into() }.into();
    }
    let settled = |i: f64| if i.abs() < LEAST_REFINED { 0.0 } else { i };
    span_cell(told.into_iter().map(|i| Quantity::Known(settled(i))), "A")
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
