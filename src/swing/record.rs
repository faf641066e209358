//! Gathers the figures of one part from its steps: sums with the weights of the method, so that charges balance as
//! exactly as the steps do, crests between steps by parabolas, intervals from the modes.

use super::equations::Equations;
use super::result::{Level, OverTime};
use crate::complementarity::stepping::{Affine, Mode, Observer, Step};

/// A current beneath this share of the largest is rounding, not conduction.
const NOTHING: f64 = 1e-9;

/// Points that one waveform keeps at most.
const MOST_POINTS: usize = 40_000;

/// Looks at the steps of one window.
pub(super) struct Recorder<'a> {
    equations: &'a Equations,
    start: f64,
    diodes: Vec<DiodeRecord>,
    nodes: Vec<Curve>,
    /// Nodes whose waveforms are kept, by their place in the part.
    watched: Vec<usize>,
    waves: Vec<Vec<(f64, f64)>>,
    length: f64,
    /// Currents beneath this are what blocking diodes leak in the equations, amperes.
    nothing: f64,
    /// Unknowns and inputs at the end of the last step of a smooth stretch, where nothing is stored.
    before: Option<(Vec<f64>, Vec<f64>)>,
}

/// Weights of the beginning, the middle and the end of a step by the parabola through them (interpolatory rule on 0,
/// γ = 1 − 1/√2 and 1). Where nothing is stored no charge has to balance, so they may stand in for the method's own.
const PARABOLA: [f64; 3] = [-0.069_035_593_728_849_2, 0.804_737_854_124_365_2, 0.264_297_739_604_484];

#[derive(Default)]
struct DiodeRecord {
    charge: f64,
    square: f64,
    energy: f64,
    forward: Curve,
    reverse_peak: f64,
    reverse_voltage: Curve,
    /// Current at the beginning and the end of a step, and its length.
    pieces: Vec<(f64, f64, f64)>,
    run: Option<Run>,
    runs: Vec<Run>,
    impulse: f64,
    last: Option<f64>,
}

/// One stretch of time in one mode.
#[derive(Clone, Copy)]
struct Run {
    mode: Mode,
    from: f64,
    to: f64,
    peak: f64,
}

/// Sum and extremes of one quantity.
struct Curve {
    sum: f64,
    min: f64,
    max: f64,
    /// The last two points of a smooth stretch.
    trail: [(f64, f64); 2],
    count: u8,
}

impl Default for Curve {
    fn default() -> Self {
        Curve { sum: 0.0, min: f64::INFINITY, max: f64::NEG_INFINITY, trail: [(0.0, 0.0); 2], count: 0 }
    }
}

impl Curve {
    fn add(&mut self, time: f64, value: f64) {
        if self.count == 2 {
            let [a, b] = self.trail;
            let turns = (b.1 - a.1) * (value - b.1) < 0.0;
            // the parabola through three points turns at most an eighth of their spread beyond the middle one
            let spread = (b.1 - a.1).abs() + (value - b.1).abs();
            if turns && (b.1 + spread > self.max || b.1 - spread < self.min) {
                self.reach(crest(a, b, (time, value)));
            }
        }
        self.reach(value);
        self.trail = [self.trail[1], (time, value)];
        self.count = (self.count + 1).min(2);
    }

    fn reach(&mut self, value: f64) {
        self.min = self.min.min(value);
        self.max = self.max.max(value);
    }

    fn part(&mut self) {
        self.count = 0;
    }
}

/// Value at which the parabola through three points turns.
fn crest(a: (f64, f64), b: (f64, f64), c: (f64, f64)) -> f64 {
    let (h1, h2) = (b.0 - a.0, c.0 - b.0);
    let (d1, d2) = ((b.1 - a.1) / h1, (c.1 - b.1) / h2);
    let bend = (d2 - d1) / (h1 + h2);
    let slope = (d1 * h2 + d2 * h1) / (h1 + h2);
    let rise = -slope * slope / (4.0 * bend);
    let limit = 0.25 * ((b.1 - a.1).abs() + (c.1 - b.1).abs());
    if rise.is_finite() { b.1 + rise.clamp(-limit, limit) } else { b.1 }
}

impl<'a> Recorder<'a> {
    pub fn new(equations: &'a Equations, start: f64, nothing: f64, watched: Vec<usize>) -> Self {
        Recorder {
            start,
            diodes: equations.diodes.iter().map(|_| DiodeRecord::default()).collect(),
            nodes: equations.nodes.iter().map(|_| Curve::default()).collect(),
            waves: vec![Vec::new(); watched.len()],
            watched,
            length: 0.0,
            nothing,
            before: None,
            equations,
        }
    }

    /// Mean and extremes of each node of the part.
    pub fn levels(&self) -> Vec<Level> {
        let level = |c: &Curve| Level { mean: c.sum / self.length, min: c.min, max: c.max };
        self.nodes.iter().map(level).collect()
    }

    /// The waveforms that were kept, in the order in which they were asked for.
    pub fn waves(&mut self) -> Vec<Vec<(f64, f64)>> {
        std::mem::take(&mut self.waves)
    }

    /// The figures of each diode; intervals wrap round the end where the window repeats itself.
    pub fn diodes(&mut self, periodic: bool) -> Vec<OverTime> {
        let length = self.length;
        let largest = self.diodes.iter().map(DiodeRecord::largest).fold(0.0, f64::max);
        let nothing = self.nothing.max(NOTHING * largest);
        self.diodes.iter_mut().map(|d| d.finish(length, periodic, nothing)).collect()
    }
}

impl Observer for Recorder<'_> {
    fn step(&mut self, step: &Step<'_>) {
        let is_free = self.equations.system.cells.is_empty() && !step.is_jump;
        match (self.before.take(), step.points) {
            (Some((unknowns, inputs)), [middle, end]) if is_free => {
                let [first, second, third] = PARABOLA;
                let points = [
                    (first, unknowns, inputs),
                    (second, middle.1.clone(), middle.2.clone()),
                    (third, end.1.clone(), end.2.clone()),
                ];
                self.take(&Step { points: &points, ..*step });
            }
            _ => self.take(step),
        }
        if is_free {
            self.before = step.points.last().map(|(_, unknowns, inputs)| (unknowns.clone(), inputs.clone()));
        }
    }
}

impl Recorder<'_> {
    fn take(&mut self, step: &Step<'_>) {
        let (h, end) = (step.length, step.start + step.length - self.start);
        let Some((_, unknowns, inputs)) = step.points.last() else { return };
        self.length += h;
        let junctions = self.equations.system.junctions.iter();
        for ((record, junction), &mode) in self.diodes.iter_mut().zip(junctions).zip(step.modes) {
            let span = Span { start: step.start - self.start, end, length: h, nothing: self.nothing };
            record.step(&span, step, junction.current as usize, &junction.across, mode);
        }
        for (curve, sum) in self.nodes.iter_mut().zip(&self.equations.nodes) {
            curve.sum += h * integral(step, |unknowns, inputs| sum.at(unknowns, inputs));
            if step.is_jump {
                curve.part();
            } else {
                curve.add(end, sum.at(unknowns, inputs));
            }
        }
        for (wave, &node) in self.waves.iter_mut().zip(&self.watched) {
            if !step.is_jump && wave.len() < MOST_POINTS {
                wave.push((end, self.equations.nodes[node].at(unknowns, inputs)));
            }
        }
    }
}

/// Weighted sum over the points of a step.
fn integral(step: &Step<'_>, value: impl Fn(&[f64], &[f64]) -> f64) -> f64 {
    step.points.iter().map(|(weight, unknowns, inputs)| weight * value(unknowns, inputs)).sum()
}

struct Span {
    start: f64,
    end: f64,
    length: f64,
    nothing: f64,
}

impl DiodeRecord {
    fn step(&mut self, span: &Span, step: &Step<'_>, current: usize, across: &Affine, mode: Mode) {
        let Some((_, unknowns, inputs)) = step.points.last() else { return };
        let voltage = across.at(unknowns, inputs);
        let now = if mode == Mode::Blocking { 0.0 } else { unknowns[current] };
        let shown = if now.abs() > span.nothing { mode } else { Mode::Blocking };
        self.enter(span, shown, if step.is_jump { 0.0 } else { now.abs() });
        if step.is_jump {
            self.forward.part();
            self.reverse_voltage.part();
        } else {
            self.reverse_voltage.add(span.end, -voltage);
        }
        if mode == Mode::Blocking {
            self.last = None;
            self.forward.part();
            return;
        }
        let charge = span.length * integral(step, |unknowns, _| unknowns[current]);
        self.charge += charge;
        self.energy +=
            span.length * integral(step, |unknowns, inputs| unknowns[current] * across.at(unknowns, inputs));
        if step.is_jump {
            // how high the current was in no time is nothing that this model knows; the charge is
            self.impulse = self.impulse.max(charge);
            self.last = None;
            return;
        }
        if now.abs() <= span.nothing {
            self.last = None;
            self.forward.part();
            return;
        }
        self.square += span.length * integral(step, |unknowns, _| unknowns[current] * unknowns[current]);
        self.forward.add(span.end, now);
        self.reverse_peak = self.reverse_peak.max(-now);
        if mode == Mode::Forward {
            self.pieces.push((self.last.unwrap_or(now).max(0.0), now.max(0.0), span.length));
        }
        self.last = Some(now);
    }

    fn enter(&mut self, span: &Span, mode: Mode, size: f64) {
        match &mut self.run {
            Some(run) if run.mode == mode => {
                run.to = span.end;
                run.peak = run.peak.max(size);
            }
            run => {
                let before = run.replace(Run { mode, from: span.start, to: span.end, peak: size });
                self.runs.extend(before);
            }
        }
    }

    fn largest(&self) -> f64 {
        self.forward.max.max(self.reverse_peak).max(0.0)
    }

    fn finish(&mut self, length: f64, periodic: bool, nothing: f64) -> OverTime {
        self.runs.extend(self.run.take());
        let of = |mode| intervals(&self.runs, mode, length, periodic, nothing);
        let intervals = of(Mode::Forward);
        let total: f64 = intervals.iter().map(|(from, to)| to - from).sum();
        let span = charge_span(&self.pieces);
        // the first finest step of conduction carries what a whole one does: no jump
        let is_jump = self.impulse > 1e-4 * self.charge.abs();
        OverTime {
            conducting_share: (total / length).min(1.0),
            breakdown_intervals: of(Mode::Reverse),
            intervals,
            current_mean: self.charge / length,
            current_rms: (self.square / length).sqrt(),
            current_peak: if self.forward.max > nothing { self.forward.max } else { 0.0 },
            reverse_peak: if self.reverse_peak > nothing { self.reverse_peak } else { 0.0 },
            charge_span: span,
            decades: span.map(|(low, high)| (high / low).log10()),
            peak_reverse_voltage: self.reverse_voltage.max.max(0.0),
            energy: self.energy,
            impulse: if is_jump { self.impulse } else { 0.0 },
        }
    }
}

/// Stretches in one mode, joined where they meet, and round the end where the window repeats itself.
fn intervals(runs: &[Run], mode: Mode, length: f64, periodic: bool, nothing: f64) -> Vec<(f64, f64)> {
    let mut found: Vec<(f64, f64)> = Vec::new();
    let is_whole = |run: &&Run| run.mode == mode && run.peak > nothing;
    for run in runs.iter().filter(is_whole) {
        match found.last_mut() {
            Some(last) if run.from - last.1 <= 1e-12 * length => last.1 = run.to,
            _ => found.push((run.from, run.to)),
        }
    }
    let edge = 1e-6 * length;
    if let (true, [first, .., last]) = (periodic, &mut found[..])
        && first.0 <= edge
        && last.1 >= length - edge
    {
        last.1 = length + first.1;
        found.remove(0);
    }
    found
}

/// Currents beneath which 5 % and 95 % of the charge flow; within a step the current moves along a straight line.
fn charge_span(pieces: &[(f64, f64, f64)]) -> Option<(f64, f64)> {
    let beneath = |limit: f64| -> f64 {
        pieces
            .iter()
            .map(|&(a, b, time)| {
                let (low, high) = (a.min(b), a.max(b));
                if high <= limit {
                    0.5 * (low + high) * time
                } else if low >= limit {
                    0.0
                } else {
                    0.5 * (limit * limit - low * low) * time / (high - low)
                }
            })
            .sum()
    };
    let most = pieces.iter().map(|&(a, b, _)| a.max(b)).fold(0.0, f64::max);
    let all = beneath(most);
    if !(all > 0.0 && all.is_finite()) {
        return None;
    }
    let at = |share: f64| {
        let (mut low, mut high) = (0.0, most);
        for _ in 0..50 {
            let middle = 0.5 * (low + high);
            if beneath(middle) < share * all { low = middle } else { high = middle }
        }
        high
    };
    Some((at(0.05), at(0.95)))
}

#[cfg(test)]
mod tests {
    use super::*;

    // by hand: of a current that falls along a straight line from 1 to 0, the charge beneath i is i²
    #[test]
    fn the_charge_of_a_straight_line_lies_between_roots() {
        let (low, high) = charge_span(&[(1.0, 0.0, 1.0)]).unwrap();
        assert!((low - 0.05f64.sqrt()).abs() < 1e-9 && (high - 0.95f64.sqrt()).abs() < 1e-9);
        assert_eq!(charge_span(&[]), None);
    }

    #[test]
    fn a_parabola_turns_where_it_does() {
        let y = |t: f64| 3.0 - 2.0 * (t - 0.3) * (t - 0.3);
        assert!((crest((0.0, y(0.0)), (0.2, y(0.2)), (0.7, y(0.7))) - 3.0).abs() < 1e-12);
    }
}
