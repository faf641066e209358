//! Numbers in marks: how they are written, and when two of them say the same. Three digits, letters as netlists write
//! them (`4.31mA`, `12.0uA`, `0.652V`).

use crate::finding::{Figure, figure};

/// A magnitude in amperes: `4.31mA`, `0A`.
pub(super) fn amperes(value: f64) -> String {
    let Figure { number, unit } = figure(value, "A");
    format!("{number}{}", unit.replace('µ', "u").replace('M', "Meg"))
}

/// Volts without a prefix as long as that reads well: `0.652V`, `-12.4V`.
pub(super) fn volts(value: f64) -> String {
    if value == 0.0 {
        return "0V".into();
    }
    if !(1e-3..1e4).contains(&value.abs()) {
        let Figure { number, unit } = figure(value, "V");
        return format!("{number}{}", unit.replace('µ', "u").replace('M', "Meg"));
    }
    // the power of ten after rounding, so that 0.9996 is 1.00 and not 1.000
    let rounded = format!("{value:.2e}");
    let exponent: i32 = rounded.split_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0);
    let decimals = usize::try_from(2 - exponent).unwrap_or(0);
    format!("{value:.decimals$}V")
}

/// `4.31mA`, or `4.31mA..9.10mA` where both ends print apart.
pub(super) fn span((low, high): (f64, f64), print: fn(f64) -> String) -> String {
    let end = |value: f64| match value {
        f64::INFINITY => "inf".to_owned(),
        f64::NEG_INFINITY => "-inf".to_owned(),
        value => print(value),
    };
    let (low, high) = (end(low), end(high));
    if low == high { low } else { format!("{low}..{high}") }
}

/// Whether two marks say the same: word for word, and numbers within one unit of the last printed digit of either.
pub(super) fn agree(old: &str, new: &str) -> bool {
    let (mut old, mut new) = (old.split_whitespace(), new.split_whitespace());
    loop {
        match (old.next(), new.next()) {
            (None, None) => return true,
            (Some(old), Some(new)) if old == new || spans_agree(old, new) => {}
            _ => return false,
        }
    }
}

fn spans_agree(old: &str, new: &str) -> bool {
    let ends = |text| match str::split_once(text, "..") {
        Some((low, high)) => (low, high),
        None => (text, text),
    };
    let ((old_low, old_high), (new_low, new_high)) = (ends(old), ends(new));
    ends_agree(old_low, new_low) && ends_agree(old_high, new_high)
}

fn ends_agree(old: &str, new: &str) -> bool {
    if old == new {
        return true;
    }
    let (Some(a), Some(b)) = (Printed::read(old), Printed::read(new)) else { return false };
    // a zero has no last digit: the other number must say how small it is
    let unit = |p: &Printed| if p.value == 0.0 { 0.0 } else { p.last_digit };
    let slack = unit(&a).max(unit(&b)) * (1.0 + 1e-6);
    a.unit == b.unit && (a.value - b.value).abs() <= slack
}

/// Whether a word is one or two printed numbers of a unit, `A` or `V`: `4.31mA`, `-3.20V..inf`.
pub(super) fn is_span(word: &str, unit: char) -> bool {
    let is_number = |text: &str| {
        text.trim_start_matches('-').starts_with(|c: char| c.is_ascii_digit())
            && Printed::read(text).is_some_and(|p| p.unit == unit)
    };
    match word.split_once("..") {
        None => is_number(word),
        Some((low, high)) => {
            (low == "-inf" || is_number(low))
                && (high == "inf" || is_number(high))
                && (low, high) != ("-inf", "inf")
        }
    }
}

/// A printed number read back.
struct Printed {
    value: f64,
    /// What one more in the last digit is worth.
    last_digit: f64,
    unit: char,
}

impl Printed {
    fn read(text: &str) -> Option<Self> {
        let unit = text.chars().last().filter(|c| matches!(c, 'A' | 'V'))?;
        let body = text.strip_suffix(unit)?;
        let digits_end = body.find(|c: char| c.is_ascii_alphabetic() && c != 'e').unwrap_or(body.len());
        let (digits, prefix) = body.split_at_checked(digits_end)?;
        let scale = match prefix {
            "" => 1.0,
            "f" => 1e-15,
            "p" => 1e-12,
            "n" => 1e-9,
            "u" => 1e-6,
            "m" => 1e-3,
            "k" => 1e3,
            "Meg" => 1e6,
            "G" => 1e9,
            "T" => 1e12,
            _ => return None,
        };
        let (mantissa, exponent) = digits.split_once('e').unwrap_or((digits, "0"));
        let exponent: i32 = exponent.parse().ok()?;
        let decimals = mantissa.split_once('.').map_or(0, |(_, d)| d.len());
        let value: f64 = mantissa.parse().ok()?;
        let power = 10f64.powi(exponent) * scale;
        let last_digit = 10f64.powi(-i32::try_from(decimals).ok()?) * power;
        Some(Printed { value: value * power, last_digit, unit })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_have_three_digits() {
        for (value, text) in [
            (0.652, "0.652V"),
            (0.7, "0.700V"),
            (-12.4, "-12.4V"),
            (0.9996, "1.00V"),
            (-120.0, "-120V"),
            (1234.0, "1234V"),
            (0.00123, "0.00123V"),
            (1e-5, "10.0uV"),
            (0.0, "0V"),
            (-0.0, "0V"),
        ] {
            assert_eq!(volts(value), text);
        }
        assert_eq!(amperes(4.3e-3), "4.30mA");
        assert_eq!(amperes(12e-6), "12.0uA");
        assert_eq!(amperes(3e6), "3.00MegA");
        assert_eq!(span((4.3e-3, 9.1e-3), amperes), "4.30mA..9.10mA");
        assert_eq!(span((4.3e-3, 4.3001e-3), amperes), "4.30mA");
        assert_eq!(span((0.0, f64::INFINITY), amperes), "0A..inf");
    }

    #[test]
    fn one_unit_of_the_last_digit_is_noise_and_two_are_not() {
        assert!(agree("conducting 4.31mA 0.652V", "conducting 4.32mA 0.651V"));
        assert!(!agree("conducting 4.31mA 0.652V", "conducting 4.33mA 0.652V"));
        assert!(!agree("conducting 4.31mA 0.652V", "blocking 4.31mA 0.652V"));
        assert!(!agree("conducting 4.31mA 0.652V", "conducting 4.31mA"));
        assert!(!agree("conducting 4.31mA 0.652V", "conducting 4.31V 0.652V"));
        // over a change of the prefix, and a person's shorter number
        assert!(agree("conducting 999uA", "conducting 1.00mA"));
        assert!(agree("conducting 4.3mA 0.65V", "conducting 4.31mA 0.652V"));
        // an end that noise tells apart
        assert!(agree("conducting 4.30mA..4.31mA", "conducting 4.31mA"));
        assert!(!agree("blocking 0V", "blocking 1.00fV"));
        assert!(!agree("conducting | blocking at VIN=9", "conducting | blocking at VIN=9.01"));
    }
}
