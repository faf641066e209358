//! Exact rational numbers that stay in machine words while they fit and grow into big ones when they do not.

use num_rational::BigRational;
use num_traits::{Signed, ToPrimitive};
use std::cmp::Ordering;
use std::ops::{Add, AddAssign, Div, DivAssign, Mul, MulAssign, Neg, Sub, SubAssign};

/// An exact number. Lowest terms, positive denominator, and small wherever it fits, so equality is by form.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub enum Rat {
    /// Numerator and denominator.
    Small(i128, i128),
    /// Anything else.
    Big(Box<BigRational>),
}

use Rat::{Big, Small};

fn gcd(a: u128, b: u128) -> u128 {
    let (Ok(mut x), Ok(mut y)) = (u64::try_from(a), u64::try_from(b)) else {
        return if b == 0 { a } else { gcd(b, a % b) };
    };
    while y != 0 {
        (x, y) = (y, x % y);
    }
    u128::from(x)
}

fn common(a: i128, b: i128) -> i128 {
    if a == 1 || b == 1 { 1 } else { i128::try_from(gcd(a.unsigned_abs(), b.unsigned_abs())).unwrap_or(1) }
}

impl Rat {
    /// A whole number.
    pub const fn whole(number: i128) -> Self {
        Small(number, 1)
    }

    /// Nothing.
    pub const fn zero() -> Self {
        Small(0, 1)
    }

    /// One.
    pub const fn one() -> Self {
        Small(1, 1)
    }

    /// Ten to a power.
    pub fn power_of_ten(power: i32) -> Self {
        let ten = BigRational::from_integer(10.into());
        let big = num_traits::pow(ten, power.unsigned_abs() as usize);
        Rat::from_big(if power < 0 { big.recip() } else { big })
    }

    fn from_big(big: BigRational) -> Self {
        match (big.numer().to_i128(), big.denom().to_i128()) {
            (Some(n), Some(d)) => Small(n, d),
            _ => Big(Box::new(big)),
        }
    }

    fn to_big(&self) -> BigRational {
        match self {
            Small(n, d) => BigRational::new_raw((*n).into(), (*d).into()),
            Big(big) => (**big).clone(),
        }
    }

    /// Whether it is nothing.
    pub fn is_zero(&self) -> bool {
        matches!(self, Small(0, _))
    }

    /// Less than nothing.
    pub fn is_negative(&self) -> bool {
        match self {
            Small(n, _) => *n < 0,
            Big(big) => big.is_negative(),
        }
    }

    /// More than nothing.
    pub fn is_positive(&self) -> bool {
        !self.is_zero() && !self.is_negative()
    }

    /// One over it; it is not zero.
    pub fn recip(&self) -> Self {
        match self {
            Small(n, d) if *n > 0 => Small(*d, *n),
            Small(n, d) if *n != 0 && *n != i128::MIN => Small(-*d, -*n),
            _ => Rat::from_big(self.to_big().recip()),
        }
    }

    /// The nearest double, near enough for comparisons to 1e-15.
    pub fn float(&self) -> f64 {
        if self.is_zero() { 0.0 } else { self.to_big().to_f64().unwrap_or(f64::NAN) }
    }

    fn product(&self, other: &Rat) -> Rat {
        if let (Small(a, b), Small(c, d)) = (self, other) {
            let (left, right) = (common(*a, *d), common(*c, *b));
            let numerator = (a / left).checked_mul(c / right);
            let denominator = (b / right).checked_mul(d / left);
            if let (Some(n), Some(d)) = (numerator, denominator) {
                return Small(n, d);
            }
        }
        Rat::from_big(self.to_big() * other.to_big())
    }

    fn sum(&self, other: &Rat) -> Rat {
        self.small_sum(other).unwrap_or_else(|| Rat::from_big(self.to_big() + other.to_big()))
    }

    fn small_sum(&self, other: &Rat) -> Option<Rat> {
        let (Small(a, b), Small(c, d)) = (self, other) else { return None };
        let shared = common(*b, *d);
        let n = a.checked_mul(d / shared)?.checked_add(c.checked_mul(b / shared)?)?;
        if n == 0 {
            return Some(Rat::zero());
        }
        let d = b.checked_mul(d / shared)?;
        let again = common(n, shared);
        Some(Small(n / again, d / again))
    }
}

impl Ord for Rat {
    fn cmp(&self, other: &Self) -> Ordering {
        let difference = self - other;
        match (difference.is_zero(), difference.is_negative()) {
            (true, _) => Ordering::Equal,
            (_, true) => Ordering::Less,
            _ => Ordering::Greater,
        }
    }
}

impl PartialOrd for Rat {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Neg for &Rat {
    type Output = Rat;
    fn neg(self) -> Rat {
        match self {
            Small(n, d) if *n != i128::MIN => Small(-*n, *d),
            _ => Rat::from_big(-self.to_big()),
        }
    }
}

impl Neg for Rat {
    type Output = Rat;
    fn neg(self) -> Rat {
        -&self
    }
}

/// The operator for every mix of owned and borrowed numbers.
macro_rules! operator {
    ($trait:ident, $name:ident, $assign_trait:ident, $assign:ident, |$a:ident, $b:ident| $body:expr) => {
        operator!(@one $trait, $name, &Rat, &Rat, |$a, $b| $body);
        operator!(@one $trait, $name, Rat, &Rat, |$a, $b| $body);
        operator!(@one $trait, $name, &Rat, Rat, |$a, $b| $body);
        operator!(@one $trait, $name, Rat, Rat, |$a, $b| $body);
        operator!(@assign $assign_trait, $assign, &Rat, |$a, $b| $body);
        operator!(@assign $assign_trait, $assign, Rat, |$a, $b| $body);
    };
    (@one $trait:ident, $name:ident, $left:ty, $right:ty, |$a:ident, $b:ident| $body:expr) => {
        impl $trait<$right> for $left {
            type Output = Rat;
            fn $name(self, other: $right) -> Rat {
                let ($a, $b): (&Rat, &Rat) = (&self, &other);
                $body
            }
        }
    };
    (@assign $trait:ident, $name:ident, $right:ty, |$a:ident, $b:ident| $body:expr) => {
        impl $trait<$right> for Rat {
            fn $name(&mut self, other: $right) {
                let ($a, $b): (&Rat, &Rat) = (self, &other);
                *self = $body;
            }
        }
    };
}

operator!(Mul, mul, MulAssign, mul_assign, |a, b| a.product(b));
operator!(Div, div, DivAssign, div_assign, |a, b| a.product(&b.recip()));
operator!(Add, add, AddAssign, add_assign, |a, b| a.sum(b));
operator!(Sub, sub, SubAssign, sub_assign, |a, b| a.sum(&-b));

impl Default for Rat {
    fn default() -> Self {
        Rat::zero()
    }
}

/// Small numbers and the big ones they overflow into must tell the same story.
#[test]
fn growing_out_of_machine_words_changes_nothing() {
    let third = Rat::whole(1).product(&Rat::whole(3).recip());
    let huge = Rat::power_of_ten(60);
    assert!(matches!(huge, Big(_)));
    assert_eq!(&(&(&third + &huge) - &huge), &third);
    assert_eq!(&huge * &Rat::power_of_ten(-60), Rat::one());
    assert_eq!(Rat::whole(-6).recip(), Rat::whole(-2).recip().product(&third));
    assert!(huge > third && -&huge < third);
    assert!(((&third * &huge).float() - 1e60 / 3.0).abs() < 1e45);
}
