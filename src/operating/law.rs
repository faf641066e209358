//! The exponential junction law as far as a constant drop needs it: thermal voltage, saturation current over
//! temperature, and the voltage at a current. Shockley, Bell Syst. Tech. J. 28 (1949).

use crate::circuit::Model;

/// Boltzmann constant, J/K, exact (SI 2019).
pub const BOLTZMANN: f64 = 1.380_649e-23;
/// Elementary charge, C, exact (SI 2019).
pub const CHARGE: f64 = 1.602_176_634e-19;

/// kT/q in volts at a temperature in degrees Celsius.
pub fn thermal_voltage(celsius: f64) -> f64 {
    BOLTZMANN / CHARGE * kelvin(celsius)
}

fn kelvin(celsius: f64) -> f64 {
    celsius + 273.15
}

/// i = IS·(exp(v/(N·kT/q)) − 1), and how IS moves with temperature.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct JunctionLaw {
    /// IS at the nominal temperature, amperes, area included.
    pub saturation: f64,
    /// N.
    pub emission: f64,
    /// EG, electron volts.
    pub gap: f64,
    /// XTI.
    pub exponent: f64,
    /// TNOM, degrees Celsius.
    pub nominal: f64,
}

impl JunctionLaw {
    /// The law of a diode model: `None` without a usable IS. IS is what pins the law; N alone says how steep it
    /// is and nothing about where, so a model without IS has the drop of its material. N is 1 where not given,
    /// EG 1.11 eV, XTI 3 and TNOM 27 °C (common practice, from memory).
    pub fn of(model: &Model, area: f64, circuit_nominal: Option<f64>) -> Option<Self> {
        let parameter = |name| model.parameter(name).map(|v| v.number);
        let positive = |name| parameter(name).filter(|v| *v > 0.0 && v.is_finite());
        Some(JunctionLaw {
            saturation: positive("is")? * area,
            emission: positive("n").unwrap_or(1.0),
            gap: positive("eg").unwrap_or(1.11),
            exponent: parameter("xti").filter(|v| v.is_finite()).unwrap_or(3.0),
            nominal: parameter("tnom").or(circuit_nominal).unwrap_or(27.0),
        })
    }

    /// Natural logarithm of IS at `celsius`:
    /// IS(T) = IS·(T/Tnom)^(XTI/N)·exp(−(EG·q/kT)·(1 − T/Tnom)/N). As a logarithm because a cold white LED's
    /// IS leaves the range of doubles.
    pub fn ln_saturation(&self, celsius: f64) -> f64 {
        let ratio = kelvin(celsius) / kelvin(self.nominal);
        let energy = self.gap / thermal_voltage(celsius);
        self.saturation.ln() + (self.exponent * ratio.ln() - energy * (1.0 - ratio)) / self.emission
    }

    /// v = N·(kT/q)·ln(1 + i/IS) for i ≥ 0.
    pub fn voltage(&self, current: f64, celsius: f64) -> f64 {
        let log = current.ln() - self.ln_saturation(celsius);
        // ln(1 + eˣ) without overflow
        let sum = if log > 0.0 { log + (-log).exp().ln_1p() } else { log.exp().ln_1p() };
        self.emission * thermal_voltage(celsius) * sum
    }
}

/// The decade nearest to a current, as a power of ten; half a decade goes up. `None`, none at all and unbounded
/// count as 1 mA.
pub fn nearest_decade(current: Option<f64>) -> i32 {
    match current {
        Some(i) if i > 0.0 && i.is_finite() => (i.log10() + 0.5).floor() as i32,
        _ => -3,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn law(saturation: f64, emission: f64) -> JunctionLaw {
        JunctionLaw { saturation, emission, gap: 1.11, exponent: 3.0, nominal: 27.0 }
    }

    fn close(a: f64, b: f64, within: f64) {
        assert!((a - b).abs() <= within, "{a} is not {b} within {within}");
    }

    // computed from the exact k and q (CODATA 2018); 25.8520 mV at 300 K is 26.85 °C
    #[test]
    fn thermal_voltage_at_the_usual_temperatures() {
        close(thermal_voltage(26.85), 25.8520e-3, 5e-8);
        close(thermal_voltage(25.0), 25.6926e-3, 5e-8);
        for (celsius, millivolts) in
            [(-40.0, 20.091), (0.0, 23.538), (20.0, 25.262), (50.0, 27.847), (85.0, 30.863), (125.0, 34.310)]
        {
            close(thermal_voltage(celsius), millivolts * 1e-3, 5e-7);
        }
    }

    // kT/q·ln 10 (computed; printed as "60 mV a decade", Sedra & Smith), and per doubling kT/q·ln 2 ("18 mV")
    #[test]
    fn a_decade_of_current_is_worth_59_5_millivolts_at_300_kelvin() {
        for (emission, millivolts) in [(1.0, 59.526), (1.5, 89.29), (2.0, 119.05)] {
            let diode = JunctionLaw { nominal: 26.85, ..law(1e-15, emission) };
            let slope = diode.voltage(1e-2, 26.85) - diode.voltage(1e-3, 26.85);
            close(slope, millivolts * 1e-3, 5e-6);
        }
        let diode = JunctionLaw { nominal: 26.85, ..law(1e-15, 1.0) };
        close(diode.voltage(2e-3, 26.85) - diode.voltage(1e-3, 26.85), 17.919e-3, 1e-6);
        // 198.421 µV/K (computed; Maxim application note 1057 prints 198.6 with rounded k and q)
        close(std::f64::consts::LN_10 * (thermal_voltage(1.0) - thermal_voltage(0.0)), 198.421e-6, 1e-9);
    }

    // a diode of 0.7 V at 1 mA, N = 1, 300 K: computed from the law with the exact constants
    #[test]
    fn one_diode_over_nine_decades() {
        let at_1ma = (0.7 / thermal_voltage(26.85)).exp_m1();
        let diode = JunctionLaw { nominal: 26.85, ..law(1e-3 / at_1ma, 1.0) };
        for (current, volts) in [
            (1e-9, 0.343),
            (1e-6, 0.521),
            (1e-5, 0.581),
            (1e-4, 0.640),
            (1e-3, 0.700),
            (1e-2, 0.760),
            (0.1, 0.819),
            (1.0, 0.879),
        ] {
            close(diode.voltage(current, 26.85), volts, 5.1e-4);
        }
    }

    // textbook problem: 1 V through 1 kΩ, IS = 1 fA, thermal voltage 25 mV: 0.34 mA (a worked page prints it),
    // 0.3365 mA and 0.6635 V (computed)
    #[test]
    fn a_worked_textbook_diode() {
        let celsius = 25e-3 * CHARGE / BOLTZMANN - 273.15;
        let diode = JunctionLaw { nominal: celsius, ..law(1e-15, 1.0) };
        close(diode.voltage(0.3365e-3, celsius), 0.6635, 1e-4);
    }

    // dV/dT = (V − (EG + 3·kT/q))/T at constant current, N = 1, IS ~ T³·exp(−EG·q/kT): textbook form, from
    // memory; −1.99 mV/K at 0.60 V with EG = 1.12 eV at 300 K (computed)
    #[test]
    fn drift_follows_the_gap() {
        let at_1ma = (0.6 / thermal_voltage(26.85)).exp_m1();
        let diode = JunctionLaw {
            saturation: 1e-3 / at_1ma,
            emission: 1.0,
            gap: 1.12,
            exponent: 3.0,
            nominal: 26.85,
        };
        let slope = (diode.voltage(1e-3, 26.95) - diode.voltage(1e-3, 26.75)) / 0.2;
        close(slope, -1.99e-3, 5e-6);
    }

    #[test]
    fn tiny_saturation_currents_stay_in_range() {
        let led = JunctionLaw { saturation: 1e-20, emission: 2.0, gap: 2.7, exponent: 3.0, nominal: 27.0 };
        let cold = led.voltage(1e-2, -200.0);
        assert!(cold.is_finite() && cold > led.voltage(1e-2, 27.0));
        assert!(led.voltage(1e-320, 150.0) > 0.0);
    }

    #[test]
    fn half_a_decade_goes_up() {
        assert_eq!(nearest_decade(Some(4.3e-3)), -2);
        assert_eq!(nearest_decade(Some(3.1e-3)), -3);
        assert_eq!(nearest_decade(Some(10f64.powf(-2.5))), -2);
        assert_eq!(nearest_decade(Some(1.0)), 0);
        assert_eq!(nearest_decade(Some(0.0)), -3);
        assert_eq!(nearest_decade(Some(f64::INFINITY)), -3);
        assert_eq!(nearest_decade(None), -3);
    }
}
