//! One row a diode: when it conducts, blocks and breaks down, and for how long.

use super::rows::{LEFT, RIGHT, ROW, name};
use super::style::{self, Area, BLOCKING, BREAKDOWN, CONDUCTING, INK, LINE, Word};
use super::{Drawn, MOST_ROWS, WIDTH};
use crate::analysis::Analysis;
use crate::circuit::{Behaviour, Shape};
use crate::finding::quantity;
use crate::swing::{OverTime, Swing};
use plotters::prelude::*;
use plotters::style::text_anchor::HPos;

const HEAD: i32 = 30;

/// The rows.
pub(super) struct Timeline<'a> {
    rows: Vec<(String, &'a OverTime)>,
    more: usize,
    window: f64,
    /// Periods are told in degrees.
    has_angles: bool,
}

impl<'a> Timeline<'a> {
    pub fn of(analysis: &'a Analysis) -> Self {
        let none = Timeline { rows: Vec::new(), more: 0, window: 1.0, has_angles: false };
        let Some(swing) = &analysis.swing else { return none };
        let timed = swing.diodes.iter().filter_map(|d| Some((d, d.over_time.as_ref()?)));
        let mut rows: Vec<(String, &OverTime)> =
            timed.map(|(d, time)| (analysis.circuit.element_name(d.element), time)).collect();
        let more = rows.len().saturating_sub(MOST_ROWS);
        rows.truncate(MOST_ROWS);
        Timeline { rows, more, window: swing.window, has_angles: has_angles(analysis, swing) }
    }

    pub fn height(&self) -> u32 {
        match self.rows.len() {
            0 => 0,
            n => (HEAD + n as i32 * ROW + if self.more > 0 { ROW } else { 0 } + 10) as u32,
        }
    }

    fn x(&self, time: f64) -> i32 {
        let room = f64::from(WIDTH as i32 - LEFT - RIGHT);
        LEFT + (room * (time / self.window).clamp(0.0, 1.0)).round() as i32
    }

    pub fn draw(&self, root: &Area<'_>, top: u32) -> Drawn {
        let top = top as i32;
        style::legend(
            root,
            top + HEAD / 2,
            &[
                Word { colour: CONDUCTING, height: 14, text: "conducting" },
                Word { colour: BLOCKING, height: 2, text: "blocking" },
                Word { colour: BREAKDOWN, height: 7, text: "breakdown" },
            ],
        )?;
        for (n, (title, time)) in self.rows.iter().enumerate() {
            let y = top + HEAD + n as i32 * ROW + ROW / 2;
            name(root, title, y)?;
            root.draw(&PathElement::new(
                vec![(LEFT, y), (self.x(self.window), y)],
                BLOCKING.stroke_width(2),
            ))?;
            self.bars(root, &time.intervals, y, (-8, 8), CONDUCTING)?;
            self.bars(root, &time.breakdown_intervals, y, (0, 8), BREAKDOWN)?;
            self.angle(root, time, y)?;
        }
        if self.more > 0 {
            let y = top + HEAD + self.rows.len() as i32 * ROW + ROW / 2;
            style::write(
                root,
                &format!("and {} more", self.more),
                (LEFT, y),
                &style::words(12, INK, HPos::Left),
            )?;
        }
        let bottom = top + self.height() as i32 - 4;
        root.draw(&PathElement::new(vec![(LEFT, bottom), (self.x(self.window), bottom)], LINE))?;
        Ok(())
    }

    fn bars(
        &self,
        root: &Area<'_>,
        list: &[(f64, f64)],
        y: i32,
        (up, down): (i32, i32),
        colour: RGBColor,
    ) -> Drawn {
        for &(from, to) in list {
            // what wraps round the end begins the window again
            for (a, b) in [(from, to.min(self.window)), (0.0, to - self.window)] {
                if b > a {
                    let right = self.x(b).max(self.x(a) + 1);
                    root.draw(&Rectangle::new([(self.x(a), y + up), (right, y + down)], colour.filled()))?;
                }
            }
        }
        Ok(())
    }

    /// How long it conducts, beside the longest bar; in degrees where one sine drives everything.
    fn angle(&self, root: &Area<'_>, time: &OverTime, y: i32) -> Drawn {
        let Some(&(from, to)) = time.intervals.iter().max_by(|a, b| (a.1 - a.0).total_cmp(&(b.1 - b.0)))
        else {
            return Ok(());
        };
        let length = to - from;
        let text = match self.has_angles {
            true => format!("{:.1}°", 360.0 * length / self.window),
            false => quantity(length, "s"),
        };
        let right = self.x(to.min(self.window)) + 6;
        let (x, side) = if right < WIDTH as i32 - RIGHT - 60 {
            (right, HPos::Left)
        } else {
            (self.x(from) - 6, HPos::Right)
        };
        style::write(root, &text, (x, y - 6), &style::words(11, INK, side))
    }
}

/// Whether every source that moves is a sine of the window's own period.
fn has_angles(analysis: &Analysis, swing: &Swing) -> bool {
    let is_sine = |behaviour: &Behaviour| match behaviour {
        Behaviour::VoltageSource(source) | Behaviour::CurrentSource(source) => match source.shape {
            Some(Shape::Sine { frequency, .. }) => {
                swing.period.is_some_and(|period| (frequency * period - 1.0).abs() < 1e-6)
            }
            Some(_) => false,
            None => true,
        },
        _ => true,
    };
    swing.period.is_some() && analysis.circuit.elements.iter().all(|e| is_sine(&e.behaviour))
}
