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
/// Names of conditions listed in one line.
const NAMES_SHOWN: usize = 12;
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
    conditions(page, circuit, operating);
    let groups = groups(operating);
    for group in groups.iter().filter(|g| g.verdict() != Verdict::Unique) {
        group.write(page, circuit, operating.cases.len() > 1);
    }
    page.end();
    let views = views(operating);
    tables(page, circuit, &views);
    left_to_time(page, circuit, operating);
    for group in groups.iter().filter(|g| g.verdict() == Verdict::Unique) {
        group.write(page, circuit, operating.cases.len() > 1);
    }
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

/// `nominal: V1 = 12 V, 27 °C; then V1=9, V1=16`
fn conditions(page: &mut Page, circuit: &Circuit, operating: &Operating) {
    let Some((first, others)) = operating.cases.split_first() else { return };
    page.ink(Ink::Strong, &clean(&first.name)).plain(": ").plain(&facts(circuit, first)).end();
    if !others.is_empty() {
        let names: Vec<&str> = others.iter().map(|c| c.name.as_str()).collect();
        paragraph(page, "", &format!("and further {}", some_of(&names)));
    }
}

/// The first few names, and how many more.
fn some_of(names: &[&str]) -> String {
    let shown = &names[..names.len().min(NAMES_SHOWN)];
    match names.len() - shown.len() {
        0 => shown.join(", "),
        more => format!("{} and {more} more", shown.join(", ")),
    }
}

fn paragraph(page: &mut Page, indent: &str, text: &str) {
    for line in wrap(text, WIDTH - indent.len()) {
        page.plain(indent).plain(&line).end();
    }
}

/// Conditions that end alike: one verdict for the same causes.
struct Group<'a> {
    cases: Vec<&'a Case>,
    causes: Vec<&'a str>,
}

fn groups(operating: &Operating) -> Vec<Group<'_>> {
    let mut groups: Vec<Group<'_>> = Vec::new();
    for case in &operating.cases {
        let causes: Vec<&str> = case.contradictions.iter().map(|c| c.text.as_str()).collect();
        match groups.iter_mut().find(|g| g.verdict() == case.verdict && g.causes == causes) {
            Some(group) => group.cases.push(case),
            None => groups.push(Group { cases: vec![case], causes }),
        }
    }
    groups
}

impl Group<'_> {
    fn verdict(&self) -> Verdict {
        self.cases.first().map_or(Verdict::Unverified, |c| c.verdict)
    }

    /// The verdict, where it holds, what it means, its causes, and what is open.
    fn write(&self, page: &mut Page, circuit: &Circuit, with_names: bool) {
        let Some(first) = self.cases.first() else { return };
        let names: Vec<&str> = self.cases.iter().map(|c| c.name.as_str()).collect();
        let place = if with_names { format!(" in {}", some_of(&names)) } else { String::new() };
        let word = self.verdict().word();
        let sentence = format!("{word}{place}: {}", self.meaning());
        for (n, line) in wrap(&sentence, WIDTH).iter().enumerate() {
            match line.strip_prefix(word).filter(|_| n == 0) {
                Some(rest) => page.ink(verdict_ink(self.verdict()), word).plain(rest).end(),
                None => page.plain(line).end(),
            };
        }
        for cause in &self.causes {
            paragraph(page, "  ", cause);
        }
        for solution in &first.solutions {
            open_quantities(page, circuit, solution);
        }
    }

    /// What the verdict means here.
    fn meaning(&self) -> String {
        let worst = self.cases.iter().map(|c| c.residual.relative).fold(0.0, f64::max);
        let sets = self.cases.iter().map(|c| c.solutions.len()).max().unwrap_or(0);
        match self.verdict() {
            Verdict::Unique if worst == 0.0 => {
                "one set of states and no other; it satisfies the circuit laws exactly".into()
            }
            Verdict::Unique => format!(
                "one set of states and no other; put back into the circuit laws, it misses none by more than \
                 {worst:.0e} of the largest term"
            ),
            Verdict::Shared => "every voltage is settled; how some currents divide is open".into(),
            Verdict::Floating => "every current is settled; some potentials are open".into(),
            Verdict::SharedFloating => "how some currents divide and some potentials are open".into(),
            Verdict::Several if self.cases.iter().any(|c| c.truncated) => {
                format!("more than {sets} sets of states satisfy the circuit laws")
            }
            Verdict::Several => format!("{sets} sets of states satisfy the circuit laws"),
            Verdict::Partial => "parts of the circuit could not be evaluated".into(),
            Verdict::None => "no set of states satisfies the circuit laws".into(),
            Verdict::Unverified => {
                "the result does not satisfy the circuit laws closely enough to be shown".into()
            }
        }
    }
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
        let text = format!("  open: {}  {}", clean(name), interval(*low, *high, unit));
        page.ink(Ink::Warning, &text).end();
    }
    if open.len() > OPEN_SHOWN {
        page.plain(&format!("  and {} more open", open.len() - OPEN_SHOWN)).end();
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
            page.ink(Ink::Strong, "the same state in every condition").end();
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
            let names: Vec<&str> = self.results.iter().map(|(v, _)| v.name.as_str()).collect();
            cells.push(Cell::word(clean(&some_of(&names))));
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::analyse;
    use crate::config::Options;
    use crate::operating::{Contradiction, DropOrigin, NodeResult, Residual};
    use crate::text::Memory;
    use std::path::Path;

    const NETLIST: &str =
        "t\nV1 in 0 12\nR1 in a 1k\nD1 a 0 DX\nD2 in b DX\nD3 0 b DX\nI1 b 0 1m\n.model DX D\n";

    fn diode(element: usize, state: State, current: Quantity, voltage: f64) -> DiodeResult {
        let origin = DropOrigin::Model { model: "DX".into(), decade: 1e-3 };
        DiodeResult {
            element: ElementId::new(element),
            state,
            not_evaluated: None,
            voltage: Quantity::Known(voltage),
            current,
            power: None,
            drop: Drop { volts: 0.7, written: false, origin },
            breakdown: None,
            series: 0.0,
            view: None,
            margin: Some(1.234),
        }
    }

    fn case(name: &str, verdict: Verdict, diodes: Vec<DiodeResult>) -> Case {
        let node = NodeResult {
            node: crate::circuit::NodeId::new(1),
            voltage: Quantity::Open(Interval { low: 0.0, high: f64::INFINITY }),
        };
        let nodes = if verdict == Verdict::Floating { vec![node] } else { Vec::new() };
        let cause = Contradiction { verdict, text: "D2 alone leads there".into(), elements: Vec::new() };
        Case {
            name: name.into(),
            sources: vec![(ElementId::new(0), 12.0)],
            supplies: Vec::new(),
            instant: false,
            temperature: 27.0,
            verdict,
            contradictions: if verdict == Verdict::Unique { Vec::new() } else { vec![cause] },
            truncated: false,
            solves: 2,
            residual: Residual { current: 0.0, voltage: 0.0, relative: 2e-16 },
            solutions: vec![Solution { diodes, nodes, branches: Vec::new() }],
        }
    }

    fn shown(cases: Vec<Case>) -> String {
        let mut files = Memory::with("a.net", NETLIST);
        let mut analysis = analyse(&mut files, Path::new("a.net"), &Options::default()).unwrap();
        analysis.operating = Some(Operating { cases, left_to_time: Vec::new(), why: None });
        let mut page = Page::new(false);
        states(&mut page, &analysis);
        page.text().to_owned()
    }

    #[test]
    fn what_changes_stands_first_and_the_rest_once() {
        let known = Quantity::Known;
        let nominal = vec![
            diode(2, State::Conducting, known(11.3e-3), 0.7),
            diode(3, State::Conducting, known(1e-3), 0.7),
            diode(4, State::Blocking, known(0.0), -11.3),
        ];
        let low = vec![
            diode(2, State::Blocking, known(0.0), 0.5),
            diode(3, State::Conducting, known(0.4e-3), 0.7),
            diode(4, State::Blocking, known(0.0), 1e-15),
        ];
        let cases = vec![case("nominal", Verdict::Unique, nominal), case("V1=0.5", Verdict::Unique, low)];
        let expected = "\
nominal: V1 = 12 V, 27 °C
and further V1=0.5

changes with the condition
  diode   state        current   voltage     drop   drop from         margin   in
  D1      conducting   11.3 mA    700 mV   700 mV   model DX at 1mA   1.23 V   nominal
          blocking        0 A     500 mV   700 mV   model DX at 1mA   1.23 V   V1=0.5

the same state in every condition
  diode   state                 current        voltage     drop   drop from         margin
  D2      conducting   400 µA … 1.00 mA         700 mV   700 mV   model DX at 1mA   1.23 V
  D3      blocking                 0 A    -11.3 … 0 V    700 mV   model DX at 1mA   1.23 V

unique in nominal, V1=0.5: one set of states and no other; put back into the circuit laws, it
misses none by more than 2e-16 of the largest term
3 diodes: 2 conducting, 1 blocking (nominal); 2 conditions, 4 factorizations
";
        let shown = shown(cases);
        assert_eq!(shown, expected, "\n{shown}");
    }

    #[test]
    fn what_is_open_is_an_interval_with_its_cause() {
        let open = Quantity::Open(Interval { low: 0.0, high: 2.15e-3 });
        let mut lost = diode(4, State::NotEvaluated, Quantity::Unknown, 0.0);
        lost.voltage = Quantity::Unknown;
        lost.margin = None;
        lost.not_evaluated = Some("Q1 is a transistor".into());
        let diodes =
            vec![diode(2, State::Conducting, open, 0.7), diode(3, State::Conducting, open, 0.7), lost];
        let expected = "\
nominal: V1 = 12 V, 27 °C
floating: every current is settled; some potentials are open
  D2 alone leads there
  open: node in  at least 0 V

  diode   state           current               voltage     drop   drop from         margin
  D1      conducting      open: 0 A … 2.15 mA    700 mV   700 mV   model DX at 1mA   1.23 V
  D2      conducting      open: 0 A … 2.15 mA    700 mV   700 mV   model DX at 1mA   1.23 V
  D3      not evaluated   -                           -   700 mV   model DX at 1mA
  D3 is not evaluated: Q1 is a transistor

3 diodes: 2 conducting, 1 not evaluated; 1 condition, 2 factorizations
";
        let shown = shown(vec![case("nominal", Verdict::Floating, diodes)]);
        assert_eq!(shown, expected, "\n{shown}");
    }
}
