//! Decimal numbers exactly as they are written in a netlist: an integer times a power of ten.

use std::fmt;

/// `digits · 10^exponent`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Dec {
    /// The integer.
    pub digits: i64,
    /// The power of ten.
    pub exponent: i32,
}

impl Dec {
    /// Nothing.
    pub const ZERO: Dec = Dec { digits: 0, exponent: 0 };

    /// `digits · 10^exponent`, without trailing zeros.
    pub const fn new(digits: i64, exponent: i32) -> Self {
        if digits == 0 {
            return Dec::ZERO;
        }
        let (mut digits, mut exponent) = (digits, exponent);
        while digits % 10 == 0 {
            digits /= 10;
            exponent += 1;
        }
        Dec { digits, exponent }
    }

    /// Thousandths.
    pub const fn milli(digits: i64) -> Self {
        Dec::new(digits, -3)
    }

    /// Ten to the `power` times as much.
    pub fn scaled(self, power: i32) -> Self {
        Dec::new(self.digits, self.exponent + power)
    }

    /// The other sign.
    pub fn negated(self) -> Self {
        Dec::new(-self.digits, self.exponent)
    }

    /// Whether it is nothing.
    pub fn is_zero(self) -> bool {
        self.digits == 0
    }

    /// The nearest double.
    pub fn float(self) -> f64 {
        self.to_string().parse().unwrap_or(f64::NAN)
    }
}

impl From<i64> for Dec {
    fn from(whole: i64) -> Self {
        Dec::new(whole, 0)
    }
}

impl fmt::Display for Dec {
    /// Plain where that is short, else with a power of ten; both are netlist numbers.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Dec { digits, exponent } = *self;
        let text = digits.unsigned_abs().to_string();
        let sign = if digits < 0 { "-" } else { "" };
        match exponent {
            0..=6 => write!(f, "{sign}{text}{}", "0".repeat(exponent.unsigned_abs() as usize)),
            -9..=-1 => {
                let places = exponent.unsigned_abs() as usize;
                let padded = format!("{text:0>width$}", width = places + 1);
                let (whole, part) = padded.split_at(padded.len() - places);
                write!(f, "{sign}{whole}.{part}")
            }
            _ => write!(f, "{sign}{text}e{exponent}"),
        }
    }
}
