//! Sums of written numbers as exact decimals: three times 0.7 is 2.1, which binary fractions do not say.

use crate::complementarity::{Level, sign_of_sum};
use std::cmp::Ordering;

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
    let terms: Vec<(f64, Level)> =
        terms.into_iter().map(|(value, exact)| (1.0, Level { value, exact })).collect();
    let total: f64 = terms.iter().map(|(_, level)| level.value).sum();
    if !terms.iter().all(|(_, level)| level.value.is_finite()) {
        return Sum::Unknown;
    }
    match sign_of_sum(&terms) {
        Ordering::Equal => Sum::Zero,
        _ => Sum::Volts(total),
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
