//! What a moving source is worth at any time, and when it is first greatest and first least. Time on its own:
//! nothing here knows circuits. Definitions of the five shapes are common practice, from memory.

use super::behaviour::Shape;
use std::f64::consts::{PI, TAU};

/// An exponential has settled after so many time constants: e⁻⁴⁰ is beneath double precision.
const SETTLED: f64 = 40.0;

impl Shape {
    /// The same shape with all its volts or amperes times a factor.
    #[must_use]
    pub fn times(self, factor: f64) -> Self {
        match self {
            Shape::Sine { offset, amplitude, frequency, delay, damping, phase } => Shape::Sine {
                offset: offset * factor,
                amplitude: amplitude * factor,
                frequency,
                delay,
                damping,
                phase,
            },
            Shape::Pulse { low, high, delay, rise, fall, width, period } => {
                Shape::Pulse { low: low * factor, high: high * factor, delay, rise, fall, width, period }
            }
            Shape::Points(points) => Shape::Points(points_times(points, factor)),
            Shape::Repeated { points, from } => {
                Shape::Repeated { points: points_times(points, factor), from }
            }
            Shape::Exponential { low, high, delay1, tau1, delay2, tau2 } => {
                Shape::Exponential { low: low * factor, high: high * factor, delay1, tau1, delay2, tau2 }
            }
            Shape::Modulated { offset, amplitude, carrier, index, signal } => Shape::Modulated {
                offset: offset * factor,
                amplitude: amplitude * factor,
                carrier,
                index,
                signal,
            },
        }
    }

    /// Value at time `t` in seconds (volts or amperes); before its beginning the value at its beginning.
    pub fn value(&self, t: f64) -> f64 {
        match *self {
            Shape::Sine { offset, amplitude, frequency, delay, damping, phase } => {
                let since = (t - delay).max(0.0);
                let angle = TAU * frequency * since + phase.to_radians();
                offset + amplitude * (-damping * since).exp() * angle.sin()
            }
            Shape::Pulse { .. } => self.pulse(t),
            Shape::Points(ref points) => interpolate(points, t),
            Shape::Repeated { ref points, from } => interpolate(points, folded(t, points, from)),
            Shape::Exponential { low, high, delay1, tau1, delay2, tau2 } => {
                let rise = |from: f64, tau: f64| if t > from { -f64::exp_m1(-(t - from) / tau) } else { 0.0 };
                low + (high - low) * (rise(delay1, tau1) - rise(delay2, tau2))
            }
            Shape::Modulated { offset, amplitude, carrier, index, signal } => {
                offset + amplitude * (TAU * carrier * t + index * (TAU * signal * t).sin()).sin()
            }
        }
    }

    fn pulse(&self, t: f64) -> f64 {
        let Shape::Pulse { low, high, delay, rise, fall, width, period } = *self else { return 0.0 };
        if t < delay {
            return low;
        }
        let mut at = t - delay;
        if period > 0.0 && period.is_finite() {
            at -= (at / period).floor() * period;
        }
        if at < rise {
            low + (high - low) * at / rise
        } else if at <= rise + width {
            high
        } else if at < rise + width + fall {
            high + (low - high) * (at - rise - width) / fall
        } else {
            low
        }
    }

    /// The first time at which it is greatest and the first at which it is least, in seconds from 0 on.
    /// A value that is only approached counts as reached when it has settled; one that grows without end is
    /// followed to `stop`, or where there is none, for one period.
    pub fn extremes(&self, stop: Option<f64>) -> (f64, f64) {
        let candidates = match *self {
            Shape::Sine { frequency, delay, damping, phase, .. } => {
                sine_turns(frequency, delay, damping, phase.to_radians(), stop)
            }
            Shape::Pulse { delay, rise, fall, width, .. } => {
                vec![delay, delay + rise, delay + rise + width + fall]
            }
            // one run through all of them passes every value that a repetition has
            Shape::Points(ref points) | Shape::Repeated { ref points, .. } => {
                points.iter().map(|p| p.0).collect()
            }
            Shape::Exponential { delay1, tau1, delay2, tau2, .. } => {
                // where the second exponential is the faster, the sum undershoots and turns once more
                let turn = (delay2 / tau2 - delay1 / tau1 + (tau1 / tau2).ln()) / (1.0 / tau2 - 1.0 / tau1);
                let settled = delay2.min(delay1 + SETTLED * tau1);
                vec![delay1, settled, delay2, turn, delay2 + SETTLED * tau1.max(tau2)]
            }
            Shape::Modulated { carrier, index, signal, .. } => modulated_turns(carrier, index, signal),
        };
        self.pick(&candidates)
    }

    /// The candidates (and 0) at which it is greatest and least, the earliest of equals.
    fn pick(&self, candidates: &[f64]) -> (f64, f64) {
        let start = (0.0, self.value(0.0));
        let (mut most, mut least) = (start, start);
        let mut times: Vec<f64> = candidates.iter().copied().filter(|t| t.is_finite() && *t > 0.0).collect();
        times.sort_by(f64::total_cmp);
        for t in times {
            let value = self.value(t);
            let slack = 1e-12 * (most.1 - least.1).abs();
            if value > most.1 + slack {
                most = (t, value);
            }
            if value < least.1 - slack {
                least = (t, value);
            }
        }
        (most.0, least.0)
    }
}

fn points_times(points: Vec<(f64, f64)>, factor: f64) -> Vec<(f64, f64)> {
    points.into_iter().map(|(t, v)| (t, v * factor)).collect()
}

/// The time of the first run that shows what a repeated course is worth at `t`.
fn folded(t: f64, points: &[(f64, f64)], from: f64) -> f64 {
    let last = points.last().map_or(0.0, |p| p.0);
    if t <= last || last <= from { t } else { from + (t - from).rem_euclid(last - from) }
}

/// Turning points of a (damped) sine in its first period, and the end of the growth where it grows.
fn sine_turns(frequency: f64, delay: f64, damping: f64, phase: f64, stop: Option<f64>) -> Vec<f64> {
    let omega = TAU * frequency;
    if omega <= 0.0 || !omega.is_finite() {
        return vec![delay, stop.unwrap_or(delay)];
    }
    // the derivative vanishes where tan(ωτ + φ) = ω/θ; undamped, at a quarter turn
    let turn = omega.atan2(damping) - phase;
    let first = (turn / PI).rem_euclid(1.0) * PI;
    let mut times: Vec<f64> = (0..3).map(|k| delay + (first + PI * f64::from(k)) / omega).collect();
    if damping < 0.0 {
        let end = stop.unwrap_or(delay + 1.0 / frequency);
        let last = ((end - delay) * omega - first) / PI;
        times.extend([0.0, 1.0].map(|back| delay + (first + PI * (last.floor() - back)) / omega));
        times.push(end);
        times.retain(|&t| t <= end);
    }
    times
}

/// First times at which the angle of a frequency-modulated sine passes an odd number of quarter turns.
fn modulated_turns(carrier: f64, index: f64, signal: f64) -> Vec<f64> {
    let angle = |t: f64| TAU * carrier * t + index * (TAU * signal * t).sin();
    let fastest = carrier.abs() + (index * signal).abs();
    if fastest <= 0.0 || !fastest.is_finite() {
        return Vec::new();
    }
    let step = 1.0 / (64.0 * fastest);
    let mut found = Vec::new();
    let mut t = 0.0;
    // two turns of the carrier, or one of the signal where the carrier stands still
    let slowest = if carrier == 0.0 { signal.abs() } else { carrier.abs() };
    let steps = (128.0 * fastest / slowest).min(1e6) as usize;
    for _ in 0..steps {
        for target in [-1.5 * PI, -0.5 * PI, 0.5 * PI, 1.5 * PI] {
            let (mut low, mut high) = (t, t + step);
            if (angle(low) - target) * (angle(high) - target) > 0.0 {
                continue;
            }
            for _ in 0..60 {
                let middle = 0.5 * (low + high);
                if (angle(low) - target) * (angle(middle) - target) <= 0.0 {
                    high = middle
                } else {
                    low = middle
                }
            }
            found.push(high);
        }
        t += step;
    }
    found
}

fn interpolate(points: &[(f64, f64)], t: f64) -> f64 {
    let after = points.partition_point(|p| p.0 <= t);
    match (after.checked_sub(1).and_then(|n| points.get(n)), points.get(after)) {
        (Some(&(t0, v0)), Some(&(t1, v1))) => v0 + (v1 - v0) * (t - t0) / (t1 - t0),
        (Some(&(_, v)), None) | (None, Some(&(_, v))) => v,
        (None, None) => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(a: f64, b: f64) {
        assert!((a - b).abs() < 1e-9 * (1.0 + b.abs()), "{a} is not {b}");
    }

    fn sine(delay: f64, damping: f64, phase: f64) -> Shape {
        Shape::Sine { offset: 1.0, amplitude: 10.0, frequency: 50.0, delay, damping, phase }
    }

    // the shapes' definitions: common practice, from memory; the numbers follow from them by hand
    #[test]
    fn a_sine_is_greatest_after_a_quarter_period() {
        let (most, least) = sine(0.0, 0.0, 0.0).extremes(None);
        close(most, 5e-3);
        close(least, 15e-3);
        close(sine(0.0, 0.0, 0.0).value(most), 11.0);
        let (most, least) = sine(0.0, 0.0, 90.0).extremes(None);
        close(most, 0.0);
        close(least, 10e-3);
    }

    #[test]
    fn a_sine_waits_at_its_first_value_and_dies_away() {
        let late = sine(1.0, 0.0, 0.0);
        close(late.value(0.5), 1.0);
        close(late.extremes(None).0, 1.005);
        let dying = sine(0.0, 100.0, 0.0);
        let (most, least) = dying.extremes(None);
        // tan(ωτ) = ω/θ: τ = atan(2π·50/100)/(2π·50)
        close(most, (TAU * 0.5).atan() / (TAU * 50.0));
        close(least, most + 10e-3);
        for n in 0..400 {
            let value = dying.value(f64::from(n) * 1e-4);
            assert!(value <= dying.value(most) + 1e-12 && value >= dying.value(least) - 1e-12);
        }
    }

    #[test]
    fn a_growing_sine_is_followed_to_the_end_of_the_span() {
        let growing = sine(0.0, -10.0, 0.0);
        let (most, least) = growing.extremes(Some(0.1));
        for n in 0..=1000 {
            let value = growing.value(f64::from(n) * 1e-4);
            assert!(value <= growing.value(most) + 1e-9 && value >= growing.value(least) - 1e-9);
        }
    }

    #[test]
    fn a_pulse_reaches_its_second_level_after_the_rise() {
        let pulse =
            Shape::Pulse { low: -1.0, high: 4.0, delay: 1.0, rise: 0.5, fall: 0.25, width: 2.0, period: 5.0 };
        assert_eq!(pulse.extremes(None), (1.5, 0.0));
        close(pulse.value(1.25), 1.5);
        close(pulse.value(3.0), 4.0);
        close(pulse.value(3.625), 1.5);
        close(pulse.value(6.25), 1.5);
        close(pulse.value(5.9), -1.0);
    }

    #[test]
    fn points_join_by_straight_lines_and_hold_their_ends() {
        let points = Shape::Points(vec![(0.0, 0.0), (1.0, 2.0), (1.0, 5.0), (3.0, -1.0)]);
        close(points.value(0.5), 1.0);
        close(points.value(1.0), 5.0);
        close(points.value(2.0), 2.0);
        close(points.value(9.0), -1.0);
        assert_eq!(points.extremes(None), (1.0, 3.0));
        assert_eq!(Shape::Points(vec![(1.0, 7.0)]).value(0.0), 7.0);
    }

    #[test]
    fn a_repeated_course_begins_again_at_its_mark() {
        let points = vec![(0.0, 9.0), (1.0, 0.0), (2.0, 4.0), (3.0, 0.0)];
        let course = Shape::Repeated { points, from: 1.0 };
        for turns in [0.0, 1.0, 2.0, 50.0] {
            close(course.value(1.5 + 2.0 * turns), 2.0);
            close(course.value(2.0 + 2.0 * turns), 4.0);
            close(course.value(2.75 + 2.0 * turns), 1.0);
        }
        close(course.value(0.0), 9.0);
        assert_eq!(course.extremes(None), (0.0, 1.0));
        close(course.times(-2.0).value(4.0), -8.0);
    }

    #[test]
    fn an_exponential_turns_at_its_second_delay() {
        let pulse =
            Shape::Exponential { low: 0.0, high: 10.0, delay1: 1.0, tau1: 1.0, delay2: 3.0, tau2: 0.5 };
        close(pulse.value(2.0), 10.0 * (1.0 - (-1.0_f64).exp()));
        let (most, least) = pulse.extremes(None);
        close(most, 3.0);
        // the derivative e^(−(t−1)) − 2·e^(−2(t−3)) vanishes at t = 5 + ln 2
        close(least, 5.0 + 2.0_f64.ln());
        for n in 0..3000 {
            assert!(pulse.value(f64::from(n) * 1e-2) >= pulse.value(least) - 1e-12);
        }
    }

    #[test]
    fn a_modulated_sine_is_greatest_at_a_quarter_turn() {
        let plain = Shape::Modulated { offset: 0.0, amplitude: 2.0, carrier: 1e3, index: 0.0, signal: 1.0 };
        let (most, least) = plain.extremes(None);
        close(most, 0.25e-3);
        close(least, 0.75e-3);
        let bent = Shape::Modulated { offset: 0.0, amplitude: 2.0, carrier: 1e3, index: 5.0, signal: 300.0 };
        let (most, least) = bent.extremes(None);
        close(bent.value(most), 2.0);
        close(bent.value(least), -2.0);
    }
}
