//! When sources move: how often they repeat, where their courses have corners, how finely they must be followed, and
//! the common period of several. Definitions of the shapes: `circuit::shape`.

use crate::circuit::Shape;

/// Steps in one period of a sine, at least: keeps the means of half-waves within 3e-5.
const STEPS_IN_A_PERIOD: f64 = 128.0;

/// Largest common period, in periods of the slowest.
const LONGEST: f64 = 1000.0;

/// Corners that one window may have.
pub(super) const MOST_CORNERS: usize = 200_000;

/// How a source repeats itself.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Rhythm {
    /// Not at all: it has come to rest at that time.
    Once(f64),
    /// With these frequencies from that time on.
    Always(f64, [Option<f64>; 2]),
}

/// How a shape repeats itself; `stop` is the end of the span that is asked for, if any.
pub(super) fn rhythm(shape: &Shape, stop: Option<f64>) -> Rhythm {
    match *shape {
        Shape::Sine { amplitude, frequency, delay, damping, .. } => {
            if amplitude == 0.0 || frequency <= 0.0 {
                Rhythm::Once(delay)
            } else if damping == 0.0 {
                Rhythm::Always(delay, [Some(frequency), None])
            } else {
                // ten thousandfold smaller, or greater
                Rhythm::Once(delay + (1e4f64.ln() / damping.abs()).max(1.0 / frequency))
            }
        }
        Shape::Pulse { delay, rise, fall, width, period, low, high } => {
            let is_long = stop.is_some_and(|stop| delay + period >= stop * (1.0 + 1e-9));
            if period > 0.0 && period.is_finite() && low != high && !is_long {
                Rhythm::Always(delay, [Some(1.0 / period), None])
            } else {
                Rhythm::Once(delay + rise + fall + if width.is_finite() { width } else { 0.0 })
            }
        }
        Shape::Points(ref points) => Rhythm::Once(points.last().map_or(0.0, |p| p.0)),
        Shape::Repeated { ref points, from } => {
            let last = points.last().map_or(0.0, |p| p.0);
            if stop.is_some_and(|stop| last >= stop * (1.0 + 1e-9)) || last <= from {
                Rhythm::Once(last)
            } else {
                Rhythm::Always(from, [Some(1.0 / (last - from)), None])
            }
        }
        Shape::Exponential { delay1, tau1, delay2, tau2, .. } => {
            Rhythm::Once(delay2.max(delay1) + 12.0 * tau1.max(tau2))
        }
        Shape::Modulated { carrier, index, signal, .. } => match (carrier.abs(), signal.abs()) {
            (c, s) if index == 0.0 || s == 0.0 => Rhythm::Always(0.0, [Some(c).filter(|c| *c > 0.0), None]),
            (c, s) => Rhythm::Always(0.0, [Some(s), Some(c).filter(|c| *c > 0.0)]),
        },
    }
}

/// The shortest time after which all frequencies repeat together, in seconds; `None` where there is none within a
/// thousand periods of the slowest.
pub(super) fn common_period(frequencies: &[f64]) -> Option<f64> {
    let slowest = frequencies.iter().copied().fold(f64::INFINITY, f64::min);
    if !(slowest > 0.0 && slowest.is_finite()) {
        return None;
    }
    let mut turns = 1.0;
    for &frequency in frequencies {
        let ratio = frequency / slowest * turns;
        turns *= denominator(ratio)?;
        if turns > LONGEST {
            return None;
        }
    }
    Some(turns / slowest)
}

/// Least whole number that makes a whole number of `ratio`, within rounding; by continued fractions.
fn denominator(ratio: f64) -> Option<f64> {
    let (mut rest, mut before, mut now) = (ratio, 0.0f64, 1.0f64);
    for _ in 0..24 {
        if (ratio * now - (ratio * now).round()).abs() <= 1e-9 * ratio.max(1.0) {
            return Some(now);
        }
        let fraction = rest - rest.floor();
        if fraction <= 0.0 {
            return None;
        }
        rest = 1.0 / fraction;
        (before, now) = (now, rest.floor() * now + before);
        if now > LONGEST {
            return None;
        }
    }
    None
}

/// Longest step that follows the shape well; `None` where it is made of straight lines.
pub(super) fn longest_step(shape: &Shape) -> Option<f64> {
    match *shape {
        Shape::Sine { amplitude, frequency, .. } => {
            (amplitude != 0.0 && frequency > 0.0).then(|| 1.0 / (STEPS_IN_A_PERIOD * frequency))
        }
        Shape::Exponential { tau1, tau2, .. } => Some(tau1.min(tau2) / 24.0),
        Shape::Modulated { carrier, index, signal, .. } => {
            let fastest = carrier.abs() + (index * signal).abs();
            (fastest > 0.0).then(|| 1.0 / (STEPS_IN_A_PERIOD * fastest))
        }
        Shape::Pulse { .. } | Shape::Points(_) | Shape::Repeated { .. } => None,
    }
}

/// Times at which the course of the shape has a corner, within a span; unsorted. `false` where there are too many.
pub(super) fn corners(shape: &Shape, from: f64, to: f64, out: &mut Vec<f64>) -> bool {
    let mut is_complete = true;
    let mut add = |t: f64| {
        if t > from && t < to {
            if out.len() <= MOST_CORNERS {
                out.push(t);
            } else {
                is_complete = false;
            }
        }
    };
    match *shape {
        Shape::Sine { delay, .. } => add(delay),
        Shape::Points(ref points) => points.iter().for_each(|p| add(p.0)),
        Shape::Repeated { ref points, from: mark } => {
            points.iter().for_each(|p| add(p.0));
            let period = points.last().map_or(0.0, |p| p.0) - mark;
            let again: Vec<f64> = points.iter().map(|p| p.0 - mark).filter(|t| *t >= 0.0).collect();
            for start in turns(mark, period, from, to).filter(|start| *start > mark) {
                again.iter().for_each(|t| add(start + t));
            }
        }
        Shape::Exponential { delay1, delay2, .. } => [delay1, delay2].into_iter().for_each(add),
        Shape::Modulated { .. } => {}
        Shape::Pulse { delay, rise, fall, width, period, .. } => {
            let edges = [0.0, rise, rise + width, rise + width + fall];
            if !(period > 0.0 && period.is_finite()) {
                edges.into_iter().for_each(|edge| add(delay + edge));
                return is_complete;
            }
            for start in turns(delay, period, from, to) {
                edges.into_iter().filter(|edge| *edge <= period).for_each(|edge| add(start + edge));
            }
        }
    }
    is_complete
}

/// Beginnings of the periods that touch a span, of a course that repeats from `begin` on; one turn more than there may be
/// corners at most, so that too many are noticed.
fn turns(begin: f64, period: f64, from: f64, to: f64) -> impl Iterator<Item = f64> {
    let first = ((from - begin) / period).floor().max(0.0);
    let most = (MOST_CORNERS + 1) as f64;
    let count = (((to - begin) / period).ceil() - first).clamp(0.0, most) as u64;
    (0..=count).map(move |n| begin + (first + n as f64) * period)
}

/// Into how many pieces a stretch without corners is cut to look for crossings.
pub(super) const CROSSING_STEPS: usize = 64;

/// Where a course passes zero between two times.
pub(super) fn crossing(value: impl Fn(f64) -> f64, from: f64, to: f64) -> Option<f64> {
    let (a, b) = (value(from), value(to));
    if (a > 0.0) == (b > 0.0) {
        return None;
    }
    let (mut low, mut high) = (from, to);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if (value(middle) > 0.0) == (a > 0.0) { low = middle } else { high = middle }
    }
    Some(high)
}

#[cfg(test)]
mod tests {
    use super::*;

    // by hand: 50 and 60 Hz repeat together every 0.1 s
    #[test]
    fn frequencies_repeat_together() {
        let close = |a: Option<f64>, b: f64| a.is_some_and(|a| (a - b).abs() < 1e-9 * b);
        assert!(close(common_period(&[50.0, 60.0]), 0.1));
        assert!(close(common_period(&[1e6, 5e3]), 2e-4));
        assert!(close(common_period(&[100.0, 50.0, 150.0]), 0.02));
        assert!(close(common_period(&[1.0 / 3e-3, 1.0 / 2e-3]), 6e-3));
        assert_eq!(common_period(&[1.0, std::f64::consts::SQRT_2]), None);
        assert_eq!(common_period(&[1000.0, 1001.0, 1500.5]), None);
        assert_eq!(common_period(&[]), None);
    }

    // by hand: 1 ms to 3 ms over and over, with corners at 1, 2, 3 ms and then at every millisecond
    #[test]
    fn a_repeated_course_has_its_corners_in_every_turn() {
        let points = vec![(0.0, 0.0), (1e-3, 0.0), (2e-3, 4.0), (3e-3, 0.0)];
        let course = Shape::Repeated { points, from: 1e-3 };
        let Rhythm::Always(from, [Some(frequency), None]) = rhythm(&course, None) else { panic!() };
        assert!((from - 1e-3).abs() < 1e-15 && (frequency - 500.0).abs() < 1e-9);
        assert_eq!(rhythm(&course, Some(2e-3)), Rhythm::Once(3e-3));
        let mut corners_found = Vec::new();
        assert!(corners(&course, 0.0, 8.5e-3, &mut corners_found));
        corners_found.sort_by(f64::total_cmp);
        corners_found.dedup_by(|a, b| (*a - *b).abs() < 1e-12);
        let expected: Vec<f64> = (1..=8).map(|n| f64::from(n) * 1e-3).collect();
        assert!(corners_found.iter().zip(&expected).all(|(a, b)| (a - b).abs() < 1e-12), "{corners_found:?}");
        assert_eq!(corners_found.len(), expected.len());
    }

    #[test]
    fn too_many_corners_are_told() {
        let pulse = |period| Shape::Pulse {
            low: 0.0,
            high: 5.0,
            delay: 0.0,
            rise: 1e-9,
            fall: 1e-9,
            width: 1e-8,
            period,
        };
        let mut few = Vec::new();
        assert!(corners(&pulse(1e-3), 0.0, 1.0, &mut few));
        // four in each period, but for the one at the beginning of the span
        assert_eq!(few.len(), 3999);
        assert!(!corners(&pulse(1e-6), 0.0, 1.0, &mut Vec::new()));
    }
}
