//! Which time is looked at: the span, the common period, the window whose figures are told, and how it is divided into
//! stretches without corners.

use super::rhythm::{self, Rhythm};
use crate::circuit::{Shape, Transient};
use crate::complementarity::stepping::Segment;

/// Halvings of a stretch at least.
const LEAST_HALVINGS: u32 = 4;

/// Finest step as halvings of the fastest period, by the number of diodes of a part.
const FINEST: [(usize, u32); 3] = [(16, 20), (64, 17), (usize::MAX, 13)];

/// Periods of the slowest source that are walked through where there is no common period.
const PERIODS: f64 = 10.0;

/// The time that is looked at, in seconds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Timing {
    /// Where the walk begins.
    pub first: f64,
    /// Whose figures are told.
    pub window: (f64, f64),
    /// Common period.
    pub period: Option<f64>,
    /// The fastest period, or the window.
    pub fastest: f64,
    /// The periodic state is sought, since no span is asked for.
    pub seeks_orbit: bool,
}

impl Timing {
    /// For all moving sources; `transient` is the span that is asked for.
    pub fn new(shapes: &[&Shape], transient: Option<Transient>) -> Self {
        let stop = transient.map(|t| t.stop).filter(|s| *s > 0.0 && s.is_finite());
        let rhythms: Vec<Rhythm> = shapes.iter().map(|shape| rhythm::rhythm(shape, stop)).collect();
        let mut frequencies: Vec<f64> = Vec::new();
        let (mut begins, mut rests, mut repeats) = (0.0f64, 0.0f64, !rhythms.is_empty());
        for rhythm in &rhythms {
            match rhythm {
                Rhythm::Once(rest) => {
                    rests = rests.max(*rest);
                    repeats = false;
                }
                Rhythm::Always(from, list) => {
                    begins = begins.max(*from);
                    frequencies.extend(list.iter().flatten());
                }
            }
        }
        let slowest = frequencies.iter().copied().fold(f64::INFINITY, f64::min);
        let fastest = frequencies.iter().copied().fold(0.0, f64::max);
        let common = rhythm::common_period(&frequencies).filter(|_| repeats);
        let fits = |period: &f64| stop.is_none_or(|stop| *period <= stop * (1.0 + 1e-9));
        let period = common.filter(fits);
        let window = match (period, stop) {
            (Some(period), Some(stop)) => ((stop - period).max(0.0), stop),
            (Some(period), None) => {
                let from = (begins / period - 1e-9).ceil().max(0.0) * period;
                (from, from + period)
            }
            (None, Some(stop)) => (transient.map_or(0.0, |t| t.start).clamp(0.0, 0.999 * stop), stop),
            (None, None) => {
                let walked = if slowest.is_finite() { begins + PERIODS / slowest } else { 0.0 };
                (0.0, (1.25 * rests).max(walked).max(1e-9))
            }
        };
        let length = window.1 - window.0;
        Timing {
            first: 0.0,
            window,
            period,
            fastest: if fastest > 0.0 { length.min(1.0 / fastest) } else { length },
            seeks_orbit: stop.is_none(),
        }
    }

    /// Ends of the stretches between two times in which no source has a corner, and whether those are all.
    pub fn edges(&self, shapes: &[&Shape], from: f64, to: f64) -> (Vec<f64>, bool) {
        let mut edges = vec![from, to];
        if let Some(period) = self.period.filter(|period| (to - from) < rhythm::MOST_CORNERS as f64 * period)
        {
            // period by period, counted from the end, so that each is divided as the window is
            let count = ((to - from) / period - 1e-9).floor().max(0.0) as u64;
            edges.extend((1..=count).map(|n| to - n as f64 * period).filter(|t| *t > from));
        }
        let mut is_complete = true;
        for shape in shapes {
            is_complete &= rhythm::corners(shape, from, to, &mut edges);
        }
        edges.sort_by(f64::total_cmp);
        edges.dedup_by(|b, a| *b - *a <= 1e-12 * (to - from));
        (edges, is_complete)
    }

    /// How a stretch is divided, for a part of so many diodes.
    pub fn segment(&self, shapes: &[&Shape], from: f64, to: f64, diodes: usize) -> Segment {
        let length = to - from;
        let longest = shapes.iter().filter_map(|s| rhythm::longest_step(s)).fold(f64::INFINITY, f64::min);
        let halvings = |step: f64| (length / step).log2().ceil().clamp(0.0, 36.0) as u32;
        let coarsest = halvings(longest).max(LEAST_HALVINGS);
        let depth = FINEST.iter().find(|(most, _)| diodes <= *most).map_or(13, |f| f.1);
        let tick = self.fastest / f64::from(1u32 << depth);
        Segment { start: from, length, coarsest, finest: halvings(tick).clamp(coarsest + 4, 40) }
    }
}
