//! Sums and products with twice the digits of `f64`, for residuals and for differences of nearly equal numbers
//! (Dekker 1971; Knuth, The Art of Computer Programming, vol. 2, 4.2.2). No decisions here.

use std::ops::{Add, AddAssign, Neg, Sub};

/// An unevaluated sum of two `f64`, the second at most half a unit in the last place of the first.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Dd {
    hi: f64,
    lo: f64,
}

impl Dd {
    pub(super) const ZERO: Dd = Dd { hi: 0.0, lo: 0.0 };

    /// Rounded to `f64`.
    pub(super) fn round(self) -> f64 {
        self.hi + self.lo
    }

    pub(super) fn abs(self) -> f64 {
        self.round().abs()
    }

    /// Multiplied by a single number.
    pub(super) fn times(self, factor: f64) -> Dd {
        let product = two_product(self.hi, factor);
        if !product.hi.is_finite() {
            return product.hi.into();
        }
        two_sum(product.hi, product.lo + self.lo * factor)
    }

    /// Divided by a single number, to about 1e-31 relative.
    pub(super) fn over(self, divisor: f64) -> Dd {
        let first = self.hi / divisor;
        if !first.is_finite() {
            return first.into();
        }
        let back = two_product(first, divisor);
        let rest = ((self.hi - back.hi) - back.lo + self.lo) / divisor;
        two_sum(first, rest)
    }
}

impl From<f64> for Dd {
    fn from(value: f64) -> Self {
        Dd { hi: value, lo: 0.0 }
    }
}

fn two_sum(a: f64, b: f64) -> Dd {
    let hi = a + b;
    let part = hi - a;
    Dd { hi, lo: (a - (hi - part)) + (b - part) }
}

fn split(a: f64) -> (f64, f64) {
    // 2^27 + 1; numbers near the overflow limit cannot be split this way and keep their head only
    let t = 134_217_729.0 * a;
    if !t.is_finite() {
        return (a, 0.0);
    }
    let head = t - (t - a);
    (head, a - head)
}

fn two_product(a: f64, b: f64) -> Dd {
    let hi = a * b;
    let ((ah, al), (bh, bl)) = (split(a), split(b));
    Dd { hi, lo: ((ah * bh - hi) + ah * bl + al * bh) + al * bl }
}

impl Add for Dd {
    type Output = Dd;
    fn add(self, other: Dd) -> Dd {
        let s = two_sum(self.hi, other.hi);
        if !s.hi.is_finite() {
            return s.hi.into();
        }
        let t = two_sum(self.lo, other.lo);
        let u = two_sum(s.hi, s.lo + t.hi);
        two_sum(u.hi, u.lo + t.lo)
    }
}

impl Neg for Dd {
    type Output = Dd;
    fn neg(self) -> Dd {
        Dd { hi: -self.hi, lo: -self.lo }
    }
}

impl Sub for Dd {
    type Output = Dd;
    fn sub(self, other: Dd) -> Dd {
        self + -other
    }
}

impl AddAssign for Dd {
    fn add_assign(&mut self, other: Dd) {
        *self = *self + other;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keeps_what_a_single_number_loses() {
        let mut sum = Dd::from(1e16);
        sum += 1.0.into();
        sum += Dd::from(-1e16);
        assert_eq!(sum.round(), 1.0);
    }

    #[test]
    fn division_is_exact_to_the_second_word() {
        let third = Dd::from(1.0).over(3.0);
        let back = third + third + third - 1.0.into();
        assert!(back.abs() < 1e-31, "{}", back.abs());
    }
}
