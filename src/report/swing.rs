//! What moves, for a person: each diode over time, the nodes that ripple, each diode over the conditions, and in
//! words what the figures hold for and what is missing.

use super::paint::{Ink, Page, clean, wrap};
use super::summary::counted;
use super::table::{self, Cell};
use crate::analysis::Analysis;
use crate::circuit::{Circuit, NodeId};
use crate::finding::{Figure, figure, quantity};
use crate::swing::{DiodeSwing, Level, OverTime, Swing};

/// Running text is broken at this width.
const WIDTH: usize = 96;

/// A current or power beneath this share of the greatest of its kind is rounding.
const ROUNDING: f64 = 1e-9;

/// Nodes that are listed unless a note watches them.
const MOST_NODES: usize = 12;

/// Writes what moves in one file.
pub fn swing(page: &mut Page, analysis: &Analysis) {
    let Some(swing) = &analysis.swing else {
        page.plain("Nothing was followed.").end();
        return;
    };
    let cases = analysis.operating.as_ref().map_or(0, |o| o.cases.len());
    heading(page, swing, cases);
    diodes_over_time(page, &analysis.circuit, swing);
    nodes(page, analysis, swing);
    conditions(page, &analysis.circuit, swing, cases);
    missing(page, &analysis.circuit, swing);
}

fn paragraph(page: &mut Page, ink: Option<Ink>, text: &str) {
    for line in wrap(text, page.room(WIDTH)) {
        match ink {
            Some(ink) => page.ink(ink, &line).end(),
            None => page.plain(&line).end(),
        };
    }
}

/// Which time the figures hold for.
fn heading(page: &mut Page, swing: &Swing, cases: usize) {
    let text = match (swing.span, swing.period) {
        (None, _) => resting(swing, cases),
        (Some(_), Some(period)) if swing.periodic => {
            format!("Periodic state, one period of {}:", quantity(period, "s"))
        }
        (Some(span), Some(period)) => format!(
            "The last period of {} in {}; the periodic state is not reached by then, so these figures still drift:",
            quantity(period, "s"),
            quantity(span, "s")
        ),
        (Some(span), None) if swing.window < span => {
            format!("From {} to {}:", quantity(swing.start, "s"), quantity(span, "s"))
        }
        (Some(span), None) => format!("The whole span of {}:", quantity(span, "s")),
    };
    paragraph(page, None, &text);
    if let Some(reason) = &swing.cut_short {
        paragraph(page, Some(Ink::Warning), &format!("Cut short: {}.", clean(reason)));
    }
    page.end();
}

/// What there is to tell where no source moves.
fn resting(swing: &Swing, cases: usize) -> String {
    let carries = swing.diodes.iter().any(|d| d.over_conditions.is_some());
    let rest = match (swing.diodes.is_empty(), carries, cases) {
        (true, _, _) => "there is no diode whose current could move.",
        (_, false, _) => "no diode carries a forward current in any condition.",
        (_, true, 0 | 1) => "no range is declared (`*@ range VIN 9 16`), so this is the only condition:",
        (_, true, _) => "what follows are the ranges over the conditions.",
    };
    format!("No source moves, so nothing happens over time; {rest}")
}

fn diodes_over_time(page: &mut Page, circuit: &Circuit, swing: &Swing) {
    let told: Vec<(&DiodeSwing, &OverTime)> =
        swing.diodes.iter().filter_map(|d| Some((d, d.over_time.as_ref()?))).collect();
    if told.is_empty() {
        return;
    }
    let head =
        ["diode", "conducts", "mean", "rms", "peak", "5 % … 95 % of charge", "decades", "reverse", "power"];
    let largest = told.iter().map(|(_, time)| time.current_peak.max(time.reverse_peak)).fold(0.0, f64::max);
    // rounding of the largest is no answer about the others
    let settle = |value: f64, largest: f64| if value.abs() < ROUNDING * largest { 0.0 } else { value };
    let powers = || told.iter().map(|(_, time)| (time.energy / swing.window).abs());
    let most_power = powers().fold(0.0, f64::max);
    let rows: Vec<Vec<Cell>> = told
        .iter()
        .map(|(diode, time)| {
            let mut cells = vec![
                Cell::word(clean(&circuit.element_name(diode.element))),
                share(time),
                figure(settle(time.current_mean, largest), "A").into(),
                figure(settle(time.current_rms, largest), "A").into(),
                peak(time),
            ];
            cells.push(time.charge_span.map_or_else(Cell::default, |(low, high)| span(low, high)));
            cells.push(time.decades.map_or_else(Cell::default, |d| Cell::word(format!("{d:.2}"))));
            cells.push(figure(time.peak_reverse_voltage, "V").into());
            cells.push(figure(settle(time.energy / swing.window, most_power), "W").into());
            cells
        })
        .collect();
    table::write(page, "  ", &head, &rows);
    page.end();
    broken_down(page, circuit, &told);
}

/// `6.4 %`, and in green what conducts at all.
fn share(time: &OverTime) -> Cell {
    match time.conducting_share {
        0.0 => Cell::inked("never", Some(Ink::Faint)),
        share => Cell::inked(format!("{} %", percent(share)), Some(Ink::Live)),
    }
}

fn percent(share: f64) -> String {
    let digits = if share < 0.0995 { 2 } else { 1 };
    format!("{:.digits$}", 100.0 * share)
}

fn peak(time: &OverTime) -> Cell {
    if time.impulse > 0.0 {
        // a jump has a charge, and no height that this model knows
        return Cell::inked(format!("jump of {}", quantity(time.impulse, "C")), Some(Ink::Warning));
    }
    figure(time.current_peak, "A").into()
}

fn span(low: f64, high: f64) -> Cell {
    let (low, high) = (figure(low, "A"), figure(high, "A"));
    let number = if low.unit == high.unit {
        format!("{} … {}", low.number, high.number)
    } else {
        format!("{} {} … {}", low.number, low.unit, high.number)
    };
    Figure { number, unit: high.unit }.into()
}

fn broken_down(page: &mut Page, circuit: &Circuit, told: &[(&DiodeSwing, &OverTime)]) {
    for (diode, time) in told.iter().filter(|(_, time)| !time.breakdown_intervals.is_empty()) {
        let text = format!(
            "{} breaks down {}, with up to {} in reverse.",
            clean(&circuit.element_name(diode.element)),
            match time.breakdown_intervals.len() {
                1 => "once".to_owned(),
                n => format!("{n} times"),
            },
            quantity(time.reverse_peak, "A")
        );
        paragraph(page, Some(Ink::Reverse), &text);
    }
}

/// Watched nodes first, then those that move most.
fn nodes(page: &mut Page, analysis: &Analysis, swing: &Swing) {
    let watched = &analysis.wiring.noted.watched;
    let all: Vec<(NodeId, Level)> = swing.nodes.iter().filter_map(|n| Some((n.node, n.over_time?))).collect();
    if all.is_empty() {
        return;
    }
    let is_watched = |node: &NodeId| watched.binary_search(node).is_ok();
    let mut shown: Vec<(NodeId, Level)> = all.iter().filter(|(n, _)| is_watched(n)).copied().collect();
    let mut rest: Vec<(NodeId, Level)> = all.iter().filter(|(n, _)| !is_watched(n)).copied().collect();
    rest.truncate(MOST_NODES.saturating_sub(shown.len()));
    shown.extend(rest);
    let rows: Vec<Vec<Cell>> = shown
        .iter()
        .map(|(node, level)| {
            vec![
                Cell::word(clean(&analysis.circuit.node_name(*node))),
                figure(settled(level.mean, level), "V").into(),
                figure(settled(level.ripple(), level), "V").into(),
                figure(settled(level.min, level), "V").into(),
                figure(settled(level.max, level), "V").into(),
            ]
        })
        .collect();
    table::write(page, "  ", &["node", "mean", "peak to peak", "least", "greatest"], &rows);
    if all.len() > shown.len() {
        let more = counted(all.len() - shown.len(), "further node");
        page.plain("  ").ink(Ink::Faint, &format!("{more} in --format json")).end();
    }
    page.end();
}

/// Rounding is shown as zero.
fn settled(value: f64, level: &Level) -> f64 {
    let largest = level.min.abs().max(level.max.abs());
    if value.abs() < 1e-7 * largest { 0.0 } else { value }
}

fn conditions(page: &mut Page, circuit: &Circuit, swing: &Swing, cases: usize) {
    let rows: Vec<Vec<Cell>> = swing
        .diodes
        .iter()
        .filter_map(|d| {
            let range = d.over_conditions.as_ref()?;
            let decades = (range.max / range.min).log10();
            Some(vec![
                Cell::word(clean(&circuit.element_name(d.element))),
                figure(range.min, "A").into(),
                figure(range.max, "A").into(),
                Cell::word(if decades.is_finite() { format!("{decades:.2}") } else { String::new() }),
                Cell::word(clean(&range.min_case)),
                Cell::word(clean(&range.max_case)),
            ])
        })
        .collect();
    if rows.is_empty() {
        return;
    }
    if cases > 1 {
        page.ink(Ink::Strong, &format!("forward current over {}", counted(cases, "condition"))).end();
    }
    table::write(page, "  ", &["diode", "least", "greatest", "decades", "least in", "greatest in"], &rows);
    page.end();
}

/// Diodes that were not followed, by reason.
fn missing(page: &mut Page, circuit: &Circuit, swing: &Swing) {
    let mut reasons: Vec<(&str, Vec<String>)> = Vec::new();
    for diode in &swing.diodes {
        let Some(reason) = diode.not_evaluated.as_deref() else { continue };
        let name = circuit.element_name(diode.element);
        match reasons.iter_mut().find(|(known, _)| *known == reason) {
            Some((_, names)) => names.push(name),
            None => reasons.push((reason, vec![name])),
        }
    }
    for (reason, names) in reasons {
        let more = names.len().saturating_sub(MOST_NODES);
        let mut list = names.into_iter().take(MOST_NODES).collect::<Vec<_>>().join(", ");
        if more > 0 {
            list = format!("{list} and {more} more");
        }
        paragraph(
            page,
            Some(Ink::Faint),
            &clean(&format!("Not followed over time: {list}, since {reason}.")),
        );
    }
    let effort = swing.effort;
    if effort.steps > 0 {
        let text = format!(
            "{} in all, {} and {} in the window, {} walked through",
            counted(effort.steps as usize, "step"),
            counted(effort.window_steps as usize, "step"),
            counted(effort.window_factorizations as usize, "factorization"),
            counted(effort.periods as usize, "period")
        );
        paragraph(page, None, &text);
    }
}
