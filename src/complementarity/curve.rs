//! One smooth monotone branch law: an exponential junction with its breakdown and a resistance in series. Voltages
//! and currents as numbers; logarithms wherever an exponent is steep. Which junction has which law is the caller's.

/// Logarithm of a current that nothing carries: beyond it exponentials are continued along their tangent, so that
/// trial points of an iteration neither overflow nor lie too far up.
const STEEPEST: f64 = 40.0;

/// i = IS·(exp(x/slope) − 1) − tail(x), with the inner voltage x = v − series·i.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Curve {
    /// ln IS: its logarithm, because a cold white LED's IS leaves the range of doubles.
    pub ln_saturation: f64,
    /// Voltage for each factor e of current, > 0.
    pub slope: f64,
    /// Reverse breakdown.
    pub tail: Option<Tail>,
    /// Resistance in series, ≥ 0.
    pub series: f64,
}

/// A reverse current of exp(ln_current − (x + level)/slope).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tail {
    /// Magnitude of the voltage at which that current flows.
    pub level: f64,
    /// Logarithm of the current there.
    pub ln_current: f64,
    /// Voltage for each factor e of current, > 0.
    pub slope: f64,
}

/// A point of a curve: terminal voltage, current, and the conductance there.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Point {
    pub(super) v: f64,
    pub(super) i: f64,
    pub(super) g: f64,
}

impl Curve {
    /// IS in amperes; 0 where it is too small for a double.
    pub fn saturation(&self) -> f64 {
        self.ln_saturation.exp()
    }

    /// Current at a terminal voltage.
    pub fn current(&self, v: f64) -> f64 {
        self.at(v).i
    }

    /// Terminal voltage that carries `i`: exact forward without breakdown, near it otherwise. A current that no
    /// voltage carries gives the least voltage that makes sense.
    pub fn voltage(&self, i: f64) -> f64 {
        let saturation = self.saturation();
        let inner = if i >= 0.0 {
            self.slope * ln_1p_exp(i.ln() - self.ln_saturation)
        } else if i > -saturation {
            self.slope * (i / saturation).ln_1p()
        } else {
            match self.tail {
                Some(tail) => {
                    let rest = (-i - saturation).max(f64::MIN_POSITIVE);
                    -tail.level - tail.slope * (rest.ln() - tail.ln_current)
                }
                None => -40.0 * self.slope,
            }
        };
        inner + self.series * i
    }

    /// The least conductance that a limited iteration should count with at a voltage: it keeps its leaps tame, far out
    /// along the chord to the origin.
    pub(super) fn least_conductance(&self, v: f64) -> f64 {
        (self.saturation() / v.abs().max(1e3 * self.slope)).max(1e-280)
    }

    /// The conductance of a point, never so small that nothing could be solved.
    pub(super) fn proper(&self, point: &Point) -> f64 {
        point.g.max(1e-15 * self.saturation() / self.slope).max(1e-280)
    }

    /// Whether the current no longer answers to the voltage in double precision.
    pub(super) fn is_saturated(&self, v: f64) -> bool {
        let steep = self.tail.map_or(0.0, |t| {
            (t.ln_current - (v + t.level) / t.slope - self.ln_saturation).min(STEEPEST).exp()
        });
        v / self.slope < -33.0 && steep < 1e-14
    }

    /// The point at a terminal voltage.
    pub(super) fn at(&self, v: f64) -> Point {
        if self.series <= 0.0 {
            let (i, g) = self.inner(v);
            return Point { v, i, g };
        }
        let mut x = self.first_inner(v);
        let (mut i, mut g) = self.inner(x);
        for _ in 0..12 {
            let step = (x + self.series * i - v) / (1.0 + self.series * g);
            // a Newton step may not leap over a knee
            x -= step.clamp(-self.slope, self.slope);
            (i, g) = self.inner(x);
            // the next step would be the square of this one
            if step.abs() <= 1e-9 * x.abs().min(self.slope) {
                break;
            }
        }
        Point { v, i, g: g / (1.0 + self.series * g) }
    }

    /// Inner voltage of each branch of the law taken alone (Lambert's W as its logarithm).
    fn first_inner(&self, v: f64) -> f64 {
        let saturation = self.saturation();
        if let Some(tail) = self.tail
            && v + tail.level < 5.0 * tail.slope
        {
            let log = (self.series / tail.slope).ln() + tail.ln_current
                - (v + self.series * saturation + tail.level) / tail.slope;
            return v + tail.slope * ln_w(log).exp() + self.series * saturation;
        }
        let log = (self.series / self.slope).ln()
            + self.ln_saturation
            + (v + self.series * saturation) / self.slope;
        v - self.slope * ln_w(log).exp() + self.series * saturation
    }

    /// Current and conductance at an inner voltage.
    fn inner(&self, x: f64) -> (f64, f64) {
        let saturation = self.saturation();
        let exponent = x / self.slope;
        let (mut i, mut g) = if exponent < 1.0 && self.ln_saturation < STEEPEST {
            (saturation * exponent.exp_m1(), saturation * exponent.exp() / self.slope)
        } else {
            let (value, rate) = steep(self.ln_saturation + exponent);
            (value - saturation, rate / self.slope)
        };
        if let Some(tail) = self.tail {
            let (value, rate) = steep(tail.ln_current - (x + tail.level) / tail.slope);
            i -= value;
            g += rate / tail.slope;
        }
        (i, g)
    }
}

/// exp and its derivative, continued along the tangent where it would overflow.
fn steep(exponent: f64) -> (f64, f64) {
    if exponent.is_nan() {
        return (exponent, exponent);
    }
    let rate = exponent.min(STEEPEST).exp();
    (rate * (1.0 + (exponent - STEEPEST).max(0.0)), rate)
}

/// ln(1 + eˣ).
fn ln_1p_exp(x: f64) -> f64 {
    if x > 0.0 { x + (-x).exp().ln_1p() } else { x.exp().ln_1p() }
}

/// The y with y + exp(y) = x, that is ln W(exp(x)): Newton from the right, where the function is convex.
fn ln_w(x: f64) -> f64 {
    let mut y = if x > 1.0 { x.ln() } else { x.min(0.0) };
    for _ in 0..40 {
        let e = y.exp();
        let step = (y + e - x) / (1.0 + e);
        y -= step;
        if step.abs() <= 1e-15 * y.abs().max(1.0) {
            break;
        }
    }
    y
}

#[cfg(test)]
mod tests {
    use super::*;

    fn curve(series: f64, level: Option<f64>) -> Curve {
        let tail = level.map(|level| Tail { level, ln_current: 1e-3f64.ln(), slope: 0.026 });
        Curve { ln_saturation: 1e-14f64.ln(), slope: 0.026, tail, series }
    }

    // the omega constant 0.567143290409783873 and W(e²) = 1.557145598997611416 (tables of Lambert's W)
    #[test]
    fn lambert() {
        assert!((ln_w(0.0).exp() - 0.567_143_290_409_783_8).abs() < 1e-15);
        assert!((ln_w(2.0).exp() - 1.557_145_598_997_611_4).abs() < 2e-15);
        assert!((ln_w(-50.0) + 50.0).abs() < 1e-15);
        assert!((ln_w(1e4).exp() + ln_w(1e4) - 1e4).abs() < 1e-9);
    }

    #[test]
    fn points_lie_on_the_law() {
        for series in [0.0, 1e-3, 10.0, 1e6] {
            for level in [None, Some(5.1)] {
                let curve = curve(series, level);
                for v in [-30.0, -5.3, -5.1, -4.9, -1.0, -1e-3, 0.0, 1e-9, 0.3, 0.7, 0.9, 5.0, 24.0] {
                    let Point { i, g, .. } = curve.at(v);
                    let x = v - series * i;
                    let exact = 1e-14 * (x / 0.026).exp_m1();
                    let exact = exact - level.map_or(0.0, |l| 1e-3 * (-(x + l) / 0.026).exp());
                    // x itself is known to a rounding of v only
                    let room = 1e-12 * exact.abs() + 4e-16 * v.abs() / 0.026 * (exact.abs() + 1e-14);
                    if exact.abs() < 1e15 {
                        assert!(
                            (i - exact).abs() <= 10.0 * room + 1e-28,
                            "{series} {level:?} {v}: {i} {exact}"
                        );
                        assert!(g >= 0.0 && g.is_finite());
                    }
                }
            }
        }
    }

    #[test]
    fn voltage_undoes_current() {
        for series in [0.0, 10.0] {
            for i in [1e-18, 1e-14, 1e-9, 1e-3, 1.0] {
                let curve = curve(series, None);
                assert!((curve.current(curve.voltage(i)) / i - 1.0).abs() < 1e-9, "{series} {i}");
            }
            let zener = curve(series, Some(5.1));
            assert!((zener.current(zener.voltage(-20e-3)) / -20e-3 - 1.0).abs() < 1e-9);
        }
    }

    #[test]
    fn no_trial_point_overflows() {
        let led = Curve { ln_saturation: -900.0, slope: 0.03, tail: None, series: 0.0 };
        assert!(led.current(100.0).is_finite() && led.current(100.0) > 0.0);
        assert_eq!(led.current(-5.0), 0.0);
    }
}
