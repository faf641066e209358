//! One row a diode on a logarithmic axis of current: what it carries over time and over the conditions, and the span in
//! which its one drop holds. A bar that leaves the shaded span is one to look at.

use super::rows::{LEFT, RIGHT, ROW, name};
use super::style::{self, Area, CASES, CONDUCTING, FAINT, INK, LINE, SPAN, Word};
use super::{Drawn, MOST_ROWS, WIDTH};
use crate::analysis::Analysis;
use crate::circuit::ElementId;
use crate::finding::quantity;
use crate::operating::DropOrigin;
use crate::swing::DiodeSwing;
use plotters::prelude::*;
use plotters::style::text_anchor::HPos;

const HEAD: i32 = 40;
const FOOT: i32 = 34;

/// Current of a drop that names none, amperes: common practice for small silicon diodes.
const USUAL: f64 = 1e-3;

struct Row {
    title: String,
    /// Over time: ends of the charge, and the peak.
    time: Option<(f64, f64, f64)>,
    cases: Option<(f64, f64)>,
    /// Current that the drop belongs to.
    reference: f64,
}

/// The rows and the ends of the axis.
pub(super) struct Currents {
    rows: Vec<Row>,
    low: f64,
    high: f64,
}

impl Currents {
    pub fn of(analysis: &Analysis) -> Self {
        let diodes = analysis.swing.iter().flat_map(|s| &s.diodes);
        let rows: Vec<Row> = diodes.filter_map(|d| row(analysis, d)).take(MOST_ROWS).collect();
        let values = rows.iter().flat_map(|r| {
            let ends = [r.reference / 10.0, r.reference * 10.0];
            let time = r.time.iter().flat_map(|t| [t.0, t.1, t.2]);
            let cases = r.cases.iter().flat_map(|c| [c.0, c.1]);
            ends.into_iter().chain(time).chain(cases).collect::<Vec<f64>>()
        });
        let sound = values.filter(|v| *v > 1e-15 && v.is_finite());
        let (low, high) = sound.fold((f64::INFINITY, 0.0f64), |(low, high), v| (low.min(v), high.max(v)));
        if rows.is_empty() || high <= 0.0 {
            return Currents { rows: Vec::new(), low: 1.0, high: 10.0 };
        }
        Currents { rows, low: 10f64.powf(low.log10().floor()), high: 10f64.powf(high.log10().ceil()) }
    }

    pub fn height(&self) -> u32 {
        match self.rows.len() {
            0 => 0,
            n => (HEAD + n as i32 * ROW + FOOT) as u32,
        }
    }

    fn x(&self, amperes: f64) -> i32 {
        let share = (amperes.max(self.low) / self.low).log10() / (self.high / self.low).log10();
        LEFT + (f64::from(WIDTH as i32 - LEFT - RIGHT) * share.clamp(0.0, 1.0)).round() as i32
    }

    pub fn draw(&self, root: &Area<'_>, top: u32) -> Drawn {
        let top = top as i32;
        style::legend(
            root,
            top + 22,
            &[
                Word { colour: SPAN, height: 18, text: "where the drop holds" },
                Word { colour: CONDUCTING, height: 9, text: "over time, 5 % to 95 % of the charge, | peak" },
                Word { colour: CASES, height: 3, text: "over the conditions" },
            ],
        )?;
        let first = top + HEAD;
        let bottom = first + self.rows.len() as i32 * ROW;
        for (n, row) in self.rows.iter().enumerate() {
            let y = first + n as i32 * ROW + ROW / 2;
            let span = [(self.x(row.reference / 10.0), y - 10), (self.x(row.reference * 10.0), y + 10)];
            root.draw(&Rectangle::new(span, SPAN.filled()))?;
        }
        self.axis(root, first, bottom)?;
        for (n, row) in self.rows.iter().enumerate() {
            self.row(root, row, first + n as i32 * ROW + ROW / 2)?;
        }
        Ok(())
    }

    fn row(&self, root: &Area<'_>, row: &Row, y: i32) -> Drawn {
        name(root, &row.title, y)?;
        if let Some((low, high, peak)) = row.time {
            let right = self.x(high).max(self.x(low) + 2);
            root.draw(&Rectangle::new([(self.x(low), y - 7), (right, y + 2)], CONDUCTING.filled()))?;
            let x = self.x(peak);
            root.draw(&PathElement::new(vec![(x, y - 10), (x, y + 5)], CONDUCTING.stroke_width(2)))?;
        }
        if let Some((low, high)) = row.cases {
            // one value is a dot that can be seen
            let widen = (6 - (self.x(high) - self.x(low))).max(0) / 2;
            let ends = [(self.x(low) - widen, y + 5), (self.x(high) + widen, y + 8)];
            root.draw(&Rectangle::new(ends, CASES.filled()))?;
        }
        Ok(())
    }

    /// A line for every decade.
    fn axis(&self, root: &Area<'_>, top: i32, bottom: i32) -> Drawn {
        let decades = (self.high / self.low).log10().round() as i32;
        let every = (decades / 10).max(1);
        for n in (0..=decades).step_by(every as usize) {
            let amperes = self.low * 10f64.powi(n);
            let x = self.x(amperes);
            root.draw(&PathElement::new(vec![(x, top), (x, bottom)], LINE))?;
            style::write(
                root,
                &quantity(amperes, "A"),
                (x, bottom + 12),
                &style::words(11, FAINT, HPos::Center),
            )?;
        }
        let text = "forward current";
        style::write(root, text, (WIDTH as i32 - RIGHT, bottom + 26), &style::words(11, INK, HPos::Right))
    }
}

fn row(analysis: &Analysis, diode: &DiodeSwing) -> Option<Row> {
    let time = diode.over_time.as_ref().and_then(|t| {
        let (low, high) = t.charge_span?;
        Some((low, high, t.current_peak.max(high)))
    });
    let cases = diode.over_conditions.as_ref().map(|c| (c.min, c.max));
    if time.is_none() && cases.is_none() {
        return None;
    }
    let title = analysis.circuit.element_name(diode.element);
    Some(Row { title, time, cases, reference: reference(analysis, diode.element) })
}

/// The current at which the diode has its drop.
fn reference(analysis: &Analysis, element: ElementId) -> f64 {
    let solutions = analysis.operating.iter().flat_map(|o| &o.cases).flat_map(|c| &c.solutions);
    let mut found = solutions.flat_map(|s| &s.diodes).filter(|d| d.element == element);
    found
        .find_map(|d| match (&d.knee, &d.drop.origin) {
            (Some(knee), _) => Some(knee.reference),
            (None, DropOrigin::Model { decade, .. }) => Some(*decade),
            _ => None,
        })
        .filter(|i| *i > 0.0 && i.is_finite())
        .unwrap_or(USUAL)
}
