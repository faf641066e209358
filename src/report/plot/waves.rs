//! The watched waveforms beneath the timeline, on the same axis of time, with their ripple.

use super::rows::{LEFT, RIGHT, name};
use super::style::{self, Area, FAINT, INK, LINE, WAVE};
use super::{Drawn, WIDTH};
use crate::analysis::Analysis;
use crate::finding::quantity;
use crate::swing::Level;
use plotters::prelude::*;
use plotters::style::text_anchor::HPos;

/// Height of one.
pub(super) const HEIGHT: u32 = 132;

/// Room above the curve and below it, the times included.
const ABOVE: i32 = 16;
const BELOW: i32 = 28;

/// One curve.
pub(super) struct Curve<'a> {
    title: String,
    points: &'a [(f64, f64)],
    level: Level,
    window: f64,
}

/// All that were kept.
pub(super) fn waves(analysis: &Analysis) -> Vec<Curve<'_>> {
    let Some(swing) = &analysis.swing else { return Vec::new() };
    let curve = |wave: &'_ crate::swing::Wave| {
        let level = swing.node(wave.node).and_then(|n| n.over_time)?;
        Some((analysis.circuit.node_name(wave.node), level))
    };
    swing
        .waves
        .iter()
        .filter_map(|wave| {
            let (title, level) = curve(wave)?;
            Some(Curve { title, points: &wave.points, level, window: swing.window })
        })
        .collect()
}

impl Curve<'_> {
    pub fn draw(&self, root: &Area<'_>, top: u32) -> Drawn {
        let (top, bottom) = (top as i32 + ABOVE, (top + HEIGHT) as i32 - BELOW);
        // between the two levels, whose labels stand at both ends
        name(root, &format!("v({})", self.title), (top + bottom) / 2)?;
        self.axis(root, top, bottom)?;
        let ripple = self.level.ripple();
        let (low, high) = self.limits();
        let y = |volts: f64| bottom - (f64::from(bottom - top) * (volts - low) / (high - low)).round() as i32;
        for (volts, label) in self.labels() {
            let dashes = (LEFT..WIDTH as i32 - RIGHT).step_by(8);
            for x in dashes {
                root.draw(&PathElement::new(vec![(x, y(volts)), (x + 4, y(volts))], FAINT))?;
            }
            style::write(root, &label, (LEFT - 10, y(volts)), &style::words(11, FAINT, HPos::Right))?;
        }
        let line: Vec<(i32, i32)> = self.points.iter().map(|&(t, v)| (self.x(t), y(v))).collect();
        root.draw(&PathElement::new(thinned(line), WAVE.stroke_width(2)))?;
        let text = format!("peak to peak {}, mean {}", quantity(ripple, "V"), quantity(self.level.mean, "V"));
        style::write(root, &text, (WIDTH as i32 - RIGHT, top - 9), &style::words(11, INK, HPos::Right))
    }

    /// Both levels with as many decimals as tell them apart; one where they are one.
    fn labels(&self) -> Vec<(f64, String)> {
        let (low, high) = (self.level.min, self.level.max);
        let largest = high.abs().max(low.abs());
        if high - low <= 1e-9 * largest {
            return vec![(high, quantity(high, "V"))];
        }
        let short = [quantity(low, "V"), quantity(high, "V")];
        if short[0] != short[1] {
            return vec![(low, short[0].clone()), (high, short[1].clone())];
        }
        // one decimal more than the distance needs
        let decimals = (1.0 - (high - low).log10().floor()).clamp(0.0, 12.0) as usize;
        [low, high].map(|volts| (volts, format!("{volts:.decimals$} V"))).to_vec()
    }

    fn limits(&self) -> (f64, f64) {
        let (low, high) = (self.level.min, self.level.max);
        let room =
            if high - low > 1e-9 * high.abs().max(low.abs()) { 0.0 } else { 0.5 * high.abs().max(1e-3) };
        (low - room, high + room)
    }

    fn x(&self, time: f64) -> i32 {
        LEFT + (f64::from(WIDTH as i32 - LEFT - RIGHT) * (time / self.window).clamp(0.0, 1.0)).round() as i32
    }

    /// Times at ten even places.
    fn axis(&self, root: &Area<'_>, top: i32, bottom: i32) -> Drawn {
        let end = self.x(self.window);
        root.draw(&Rectangle::new([(LEFT, top), (end, bottom)], LINE))?;
        for n in 0..=10 {
            let time = self.window * f64::from(n) / 10.0;
            let x = self.x(time);
            root.draw(&PathElement::new(vec![(x, bottom), (x, bottom + 4)], FAINT))?;
            if n % 2 == 0 {
                let side = if n == 10 { HPos::Right } else { HPos::Center };
                style::write(root, &quantity(time, "s"), (x, bottom + 13), &style::words(11, FAINT, side))?;
            }
        }
        Ok(())
    }
}

/// Of many points in one column only the first, least, greatest and last.
fn thinned(line: Vec<(i32, i32)>) -> Vec<(i32, i32)> {
    let mut kept: Vec<(i32, i32)> = Vec::new();
    let mut rest = &line[..];
    while let Some(&(x, first)) = rest.first() {
        let count = rest.iter().take_while(|p| p.0 == x).count();
        let (column, after) = rest.split_at(count);
        let ys = column.iter().map(|p| p.1);
        let (low, high) = ys.fold((first, first), |(low, high), y| (low.min(y), high.max(y)));
        for y in [first, low, high, column[count - 1].1] {
            if kept.last() != Some(&(x, y)) {
                kept.push((x, y));
            }
        }
        rest = after;
    }
    kept
}
