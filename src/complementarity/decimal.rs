//! Exact sums of written decimal numbers: three times 0.7 is 2.1, which binary fractions do not know.
//! Only signs of sums are told; values stay `f64`.

use super::network::Level;
use num_bigint::BigInt;
use std::cmp::Ordering;

/// Sums with computed terms are compared to this share of the largest term.
pub(super) const RELATIVE: f64 = 1e-12;

/// Sign of the sum of `sign·level` over all terms: exact where every level is exact, else with sums within
/// [`RELATIVE`] of the largest term counted as zero.
pub(crate) fn sign_of_sum(terms: &[(f64, Level)]) -> Ordering {
    let sum: f64 = terms.iter().map(|(sign, level)| sign * level.value).sum();
    let largest = terms.iter().map(|(_, level)| level.value.abs()).fold(0.0, f64::max);
    if sum.abs() > 1e-6 * largest {
        return sum.total_cmp(&0.0);
    }
    if terms.iter().all(|(_, level)| level.exact)
        && let Some(sign) = exact_sign(terms)
    {
        return sign;
    }
    if sum.abs() <= RELATIVE * largest { Ordering::Equal } else { sum.total_cmp(&0.0) }
}

fn exact_sign(terms: &[(f64, Level)]) -> Option<Ordering> {
    let parsed: Option<Vec<(BigInt, i32)>> =
        terms.iter().map(|(sign, level)| decimal(sign * level.value)).collect();
    let parsed = parsed?;
    let least = parsed.iter().map(|(_, exponent)| *exponent).min().unwrap_or(0);
    let mut sum = BigInt::ZERO;
    for (digits, exponent) in parsed {
        sum += digits * BigInt::from(10).pow(exponent.abs_diff(least));
    }
    Some(sum.cmp(&BigInt::ZERO))
}

/// Shortest decimal form as digits and exponent of ten.
fn decimal(value: f64) -> Option<(BigInt, i32)> {
    if !value.is_finite() {
        return None;
    }
    let text = format!("{value:e}");
    let (mantissa, exponent) = text.split_once('e')?;
    let exponent: i32 = exponent.parse().ok()?;
    let fraction = mantissa.split_once('.').map_or(0, |(_, f)| f.len());
    let digits: BigInt = mantissa.replace('.', "").parse().ok()?;
    Some((digits, exponent - i32::try_from(fraction).ok()?))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn exact(value: f64) -> Level {
        Level { value, exact: true }
    }

    #[test]
    fn three_drops_of_seven_tenths_are_two_point_one() {
        let drops = [(1.0, exact(0.7)), (1.0, exact(0.7)), (1.0, exact(0.7)), (-1.0, exact(2.1))];
        assert_ne!(0.7 + 0.7 + 0.7 - 2.1, 0.0, "binary fractions miss it");
        assert_eq!(sign_of_sum(&drops), Ordering::Equal);
    }

    #[test]
    fn a_nanovolt_is_not_nothing() {
        assert_eq!(sign_of_sum(&[(1.0, exact(0.700_000_001)), (-1.0, exact(0.7))]), Ordering::Greater);
        assert_eq!(sign_of_sum(&[(1.0, exact(5000.0)), (-1.0, exact(5_000.000_000_000_1))]), Ordering::Less);
    }

    #[test]
    fn computed_terms_are_compared_to_their_precision() {
        let computed = Level { value: 0.1 + 0.2, exact: false };
        assert_eq!(sign_of_sum(&[(1.0, computed), (-1.0, exact(0.3))]), Ordering::Equal);
    }
}
