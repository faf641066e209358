//! Sums of written numbers as exact decimals: three times 0.7 is 2.1, which binary fractions do not say.

use num_bigint::BigInt;

/// The sum of some numbers.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Sum {
    /// Zero: exactly, where all numbers were written; to 1e-12 of the largest term where some were computed.
    Zero,
    /// Something else.
    Volts(f64),
    /// A term is not known.
    Unknown,
}

/// Sums `terms`, each with the mark that it was written as a decimal number.
pub fn sum(terms: impl IntoIterator<Item = (f64, bool)>) -> Sum {
    let mut exact = Exact::default();
    let (mut total, mut largest, mut written) = (0.0, 0.0_f64, true);
    for (value, is_written) in terms {
        if !value.is_finite() {
            return Sum::Unknown;
        }
        written &= is_written;
        total += value;
        largest = largest.max(value.abs());
        exact.add(value);
    }
    let zero = if written { exact.is_zero() } else { f64::abs(total) <= 1e-12 * largest };
    if zero { Sum::Zero } else { Sum::Volts(total) }
}

/// A whole number times a power of ten.
#[derive(Default)]
struct Exact {
    digits: BigInt,
    exponent: i32,
}

impl Exact {
    /// Adds the shortest decimal form of `value`, which for a number read from text is what was written.
    fn add(&mut self, value: f64) {
        let text = format!("{value:e}");
        let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, "0"));
        let places = mantissa.split_once('.').map_or(0, |(_, after)| after.len());
        let digits: String = mantissa.chars().filter(|c| *c != '.').collect();
        let digits: BigInt = digits.parse().unwrap_or_default();
        let exponent = exponent.parse::<i32>().unwrap_or(0) - places as i32;
        let common = exponent.min(self.exponent);
        let raised = |digits: &BigInt, by: i32| digits * BigInt::from(10).pow(by.unsigned_abs());
        self.digits = raised(&self.digits, self.exponent - common) + raised(&digits, exponent - common);
        self.exponent = common;
    }

    fn is_zero(&self) -> bool {
        self.digits == BigInt::default()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn written_numbers_sum_as_decimals() {
        // 0.7 + 0.7 + 0.7 is not 2.1 in binary
        assert_ne!(0.7 + 0.7 + 0.7, 2.1);
        assert_eq!(sum([(0.7, true), (0.7, true), (0.7, true), (-2.1, true)]), Sum::Zero);
        assert!(matches!(sum([(0.7, true), (-0.700_000_000_000_1, true)]), Sum::Volts(_)));
        assert_eq!(sum([(1e-15, true), (1e15, true), (-1e15, true)]), Sum::Volts(0.0));
        assert_eq!(sum([]), Sum::Zero);
    }

    #[test]
    fn computed_numbers_sum_to_a_tolerance() {
        assert_eq!(sum([(0.1, false), (0.2, true), (-0.3, true)]), Sum::Zero);
        assert_eq!(sum([(1.0, false), (-0.5, true)]), Sum::Volts(0.5));
        assert_eq!(sum([(f64::NAN, false)]), Sum::Unknown);
    }
}
