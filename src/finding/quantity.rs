//! The one way a quantity is printed with its unit, in messages, tables and marks alike: three significant
//! digits, an SI prefix, never a minus before zero. It stands here because messages are built long before
//! `report`. Reading numbers is `syntax`'s.

/// SI prefixes by power of a thousand, from 10⁻¹⁵ to 10¹².
const PREFIXES: [&str; 10] = ["f", "p", "n", "µ", "m", "", "k", "M", "G", "T"];
/// Position in [`PREFIXES`] of no prefix.
const PLAIN: i32 = 5;

/// A number cut to significant digits, and its unit with the prefix: the two halves of a table cell.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Figure {
    /// Digits, with a sign where negative: `4.31`, `-12.0`.
    pub number: String,
    /// Prefix and unit: `mA`.
    pub unit: String,
}

/// Three significant digits, trailing zeros kept so that columns keep their width: `12.0` `V`.
///
/// Zero is `0`; values that no prefix reaches are in powers of ten (`3.00e-19`); infinities are `∞`.
pub fn figure(value: f64, unit: &str) -> Figure {
    let prefixed = |number: String, place: i32| {
        let prefix = usize::try_from(place).ok().and_then(|p| PREFIXES.get(p)).copied().unwrap_or("");
        Figure { number, unit: format!("{prefix}{unit}") }
    };
    if value == 0.0 {
        return prefixed("0".into(), PLAIN);
    }
    if !value.is_finite() {
        let word = if value.is_nan() {
            "?"
        } else if value > 0.0 {
            "∞"
        } else {
            "-∞"
        };
        return prefixed(word.into(), PLAIN);
    }
    // the decimal form is rounded first, so that 999.7e-3 becomes 1.00 and not 1000 m
    let scientific = format!("{value:.2e}");
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let place = PLAIN + exponent.div_euclid(3);
    if !(0..PREFIXES.len() as i32).contains(&place) {
        return prefixed(scientific, PLAIN);
    }
    prefixed(move_point(mantissa, exponent.rem_euclid(3) as usize), place)
}

/// `4.31` with the point moved right by 0, 1 or 2 places: `4.31`, `43.1`, `431`.
fn move_point(mantissa: &str, by: usize) -> String {
    let (sign, digits) = match mantissa.strip_prefix('-') {
        Some(rest) => ("-", rest),
        None => ("", mantissa),
    };
    let mut digits: Vec<char> = digits.chars().filter(|&c| c != '.').collect();
    if by + 1 < digits.len() {
        digits.insert(by + 1, '.');
    }
    sign.chars().chain(digits).collect()
}

/// The number without zeros that say nothing: `12.0` becomes `12`.
fn trimmed(number: String) -> String {
    if !number.contains('.') || number.contains('e') {
        return number;
    }
    number.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// A quantity for running text: `4.31 mA`, `652 mV`, `12 V`, `0 A`.
pub fn quantity(value: f64, unit: &str) -> String {
    let Figure { number, unit } = figure(value, unit);
    format!("{} {unit}", trimmed(number))
}

/// The same without the space, as netlists and marks write it: `4.31mA`, `10mA`.
pub fn compact(value: f64, unit: &str) -> String {
    let Figure { number, unit } = figure(value, unit);
    format!("{}{unit}", trimmed(number))
}

/// An interval of which one or both ends may be infinite: `0 A … 2.15 mA`, `at least 0 A`, `anything`.
pub fn interval(low: f64, high: f64, unit: &str) -> String {
    match (low.is_finite(), high.is_finite()) {
        (true, true) => format!("{} … {}", quantity(low, unit), quantity(high, unit)),
        (true, false) => format!("at least {}", quantity(low, unit)),
        (false, true) => format!("at most {}", quantity(high, unit)),
        (false, false) => "anything".into(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_digits_and_a_prefix() {
        // SI prefixes: BIPM, The International System of Units, 9th edition, table 7
        for (value, unit, text) in [
            (4.31e-3, "A", "4.31 mA"),
            (0.652, "V", "652 mV"),
            (12.0, "V", "12 V"),
            (-12.04, "V", "-12 V"),
            (1e3, "Ω", "1 kΩ"),
            (4.7e6, "Ω", "4.7 MΩ"),
            (100e-9, "F", "100 nF"),
            (2.5e-14, "A", "25 fA"),
            (1.0, "s", "1 s"),
            (1234.0, "V", "1.23 kV"),
        ] {
            assert_eq!(quantity(value, unit), text);
        }
    }

    #[test]
    fn rounding_carries_into_the_next_prefix() {
        assert_eq!(quantity(0.9996, "V"), "1 V");
        assert_eq!(quantity(999.4e-6, "A"), "999 µA");
        assert_eq!(quantity(999_999.0, "Ω"), "1 MΩ");
    }

    #[test]
    fn zero_has_no_sign_and_extremes_are_told() {
        assert_eq!(quantity(-0.0, "A"), "0 A");
        assert_eq!(quantity(3e-19, "A"), "3.00e-19 A");
        assert_eq!(quantity(f64::INFINITY, "A"), "∞ A");
    }

    #[test]
    fn columns_keep_their_digits() {
        let figure = figure(-0.012, "A");
        assert_eq!((figure.number.as_str(), figure.unit.as_str()), ("-12.0", "mA"));
    }

    #[test]
    fn intervals_say_which_end_is_missing() {
        assert_eq!(interval(0.0, 2.15e-3, "A"), "0 A … 2.15 mA");
        assert_eq!(interval(0.0, f64::INFINITY, "A"), "at least 0 A");
        assert_eq!(interval(f64::NEG_INFINITY, 5.0, "V"), "at most 5 V");
        assert_eq!(interval(f64::NEG_INFINITY, f64::INFINITY, "V"), "anything");
    }
}
