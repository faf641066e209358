//! Numbers with scale suffix and unit letters, and the letter code of IEC 60062 (`4k7`). The suffix is folded
//! into the decimal exponent, because multiplying by it would round one value in four wrongly.

/// A number as it was written.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Number {
    /// Its value with the scale applied, correctly rounded.
    pub value: f64,
    /// How many bytes of the text stand before the scale suffix or unit.
    pub digits: usize,
    /// How many bytes the scale suffix takes; 0 where there is none.
    pub suffix: usize,
    /// How many bytes of digits stand behind the letter of the letter code; 0 elsewhere.
    pub fraction: usize,
    /// Whether it is written in the letter code, `4k7`.
    pub letter_code: bool,
}

impl Number {
    /// Bytes that are read; behind them stands a unit or what else is ignored.
    pub fn length(&self) -> usize {
        self.digits + self.suffix + self.fraction
    }
}

/// A number that may also be written in the letter code. `None` where the text is none.
pub fn number(text: &[u8]) -> Option<Number> {
    letter_code(text).or_else(|| plain_number(text))
}

/// `number = [sign] digits ["." digits] [exponent] [scale] *unit-letter`
pub fn plain_number(text: &[u8]) -> Option<Number> {
    let (decimal, digits) = decimal(text)?;
    let rest = text.get(digits..)?;
    let (suffix, power, factor) = scale(rest);
    if !rest.get(suffix..)?.iter().all(|&b| is_unit(b)) {
        return None;
    }
    let value = decimal.scaled(power, factor)?;
    Some(Number { value, digits, suffix, fraction: 0, letter_code: false })
}

/// `letter-code = [sign] digits code-letter digits *unit-letter` (IEC 60062; there `M` is mega and `m` milli)
fn letter_code(text: &[u8]) -> Option<Number> {
    let sign = usize::from(matches!(text.first(), Some(b'+' | b'-')));
    let whole = run(text, sign);
    let (letter_len, power) = code_letter(text.get(whole..)?)?;
    let after = whole + letter_len;
    let end = run(text, after);
    if whole == sign || end == after || !text.get(end..)?.iter().all(|&b| is_unit(b)) {
        return None;
    }
    let mut decimal = Decimal { negative: text.first() == Some(&b'-'), ..Decimal::default() };
    decimal.push_all(&text[sign..whole]);
    decimal.push_all(&text[after..end]);
    decimal.exponent -= i32::try_from(end - after).ok()?;
    let value = decimal.scaled(power, 1)?;
    Some(Number { value, digits: whole, suffix: letter_len, fraction: end - after, letter_code: true })
}

fn code_letter(text: &[u8]) -> Option<(usize, i32)> {
    Some(match text {
        [b'R' | b'r' | b'F', ..] => (1, 0),
        [b'K' | b'k', ..] => (1, 3),
        [b'M', ..] => (1, 6),
        [b'G' | b'g', ..] => (1, 9),
        [b'T' | b't', ..] => (1, 12),
        [b'm', ..] => (1, -3),
        [b'u' | b'U', ..] => (1, -6),
        [0xC2, 0xB5, ..] | [0xCE, 0xBC, ..] => (2, -6),
        [b'n' | b'N', ..] => (1, -9),
        [b'p' | b'P', ..] => (1, -12),
        [b'f', ..] => (1, -15),
        _ => return None,
    })
}

/// `scale`: bytes taken, power of ten, factor (`mil` is 25.4e-6).
fn scale(text: &[u8]) -> (usize, i32, u64) {
    let starts = |word: &[u8]| text.get(..3).is_some_and(|t| t.eq_ignore_ascii_case(word));
    match text {
        [b'm' | b'M', ..] if starts(b"meg") => (3, 6, 1),
        [b'm' | b'M', ..] if starts(b"mil") => (3, -7, 254),
        [b't' | b'T', ..] => (1, 12, 1),
        [b'g' | b'G', ..] => (1, 9, 1),
        [b'k' | b'K', ..] => (1, 3, 1),
        [b'm' | b'M', ..] => (1, -3, 1),
        [b'u' | b'U', ..] => (1, -6, 1),
        [0xC2, 0xB5, ..] | [0xCE, 0xBC, ..] => (2, -6, 1),
        [b'n' | b'N', ..] => (1, -9, 1),
        [b'p' | b'P', ..] => (1, -12, 1),
        [b'f' | b'F', ..] => (1, -15, 1),
        _ => (0, 0, 1),
    }
}

/// `unit-letter`: letters, `%`, `°`, `Ω` and the rest of Unicode; ignored.
fn is_unit(byte: u8) -> bool {
    byte.is_ascii_alphabetic() || byte == b'%' || byte == b'_' || byte >= 0x80
}

fn run(text: &[u8], from: usize) -> usize {
    let rest = text.get(from..).unwrap_or_default();
    from + rest.iter().position(|b| !b.is_ascii_digit()).unwrap_or(rest.len())
}

fn decimal(text: &[u8]) -> Option<(Decimal, usize)> {
    let sign = usize::from(matches!(text.first(), Some(b'+' | b'-')));
    let mut decimal = Decimal { negative: text.first() == Some(&b'-'), ..Decimal::default() };
    let whole = run(text, sign);
    decimal.push_all(text.get(sign..whole)?);
    let mut end = whole;
    let mut count = whole - sign;
    if text.get(end) == Some(&b'.') {
        let fraction = run(text, end + 1);
        decimal.push_all(text.get(end + 1..fraction)?);
        decimal.exponent -= i32::try_from(fraction - end - 1).ok()?;
        count += fraction - end - 1;
        end = fraction;
    }
    if count == 0 {
        return None;
    }
    if let Some((power, after)) = exponent(text, end) {
        decimal.exponent = decimal.exponent.saturating_add(power);
        end = after;
    }
    Some((decimal, end))
}

/// `exponent = ("e" / "E") [sign] 1*digit`
fn exponent(text: &[u8], at: usize) -> Option<(i32, usize)> {
    if !matches!(text.get(at), Some(b'e' | b'E')) {
        return None;
    }
    let sign = usize::from(matches!(text.get(at + 1), Some(b'+' | b'-')));
    let first = at + 1 + sign;
    let end = run(text, first);
    if end == first {
        return None;
    }
    let mut power = 0i32;
    for digit in text.get(first..end)? {
        power = power.saturating_mul(10).saturating_add(i32::from(digit - b'0')).min(99_999);
    }
    Some((if text.get(at + 1) == Some(&b'-') { -power } else { power }, end))
}

/// Decimal digits and a power of ten.
#[derive(Debug, Default)]
struct Decimal {
    negative: bool,
    mantissa: u64,
    /// Digits that no longer fit the mantissa exist.
    long: Option<String>,
    exponent: i32,
}

impl Decimal {
    fn push_all(&mut self, digits: &[u8]) {
        for &digit in digits {
            if let Some(long) = &mut self.long {
                long.push(char::from(digit));
            } else if self.mantissa < 100_000_000_000_000_000 {
                self.mantissa = self.mantissa * 10 + u64::from(digit - b'0');
            } else {
                self.long = Some(format!("{}{}", self.mantissa, char::from(digit)));
            }
        }
    }

    /// The nearest double of `digits · factor · 10^(exponent + power)`; `None` where that is not finite.
    fn scaled(&self, power: i32, factor: u64) -> Option<f64> {
        let exponent = self.exponent.saturating_add(power);
        let magnitude = match &self.long {
            Some(long) if factor == 1 => format!("{long}e{exponent}").parse().ok()?,
            Some(long) => format!("{long}e{exponent}").parse::<f64>().ok()? * factor as f64,
            None => match self.mantissa.checked_mul(factor) {
                Some(mantissa) => short(mantissa, exponent)?,
                None => short(self.mantissa, exponent)? * factor as f64,
            },
        };
        magnitude.is_finite().then_some(if self.negative { -magnitude } else { magnitude })
    }
}

/// Clinger's fast path: both factors are exact doubles, so one operation rounds once; else the standard library.
fn short(mantissa: u64, exponent: i32) -> Option<f64> {
    const POWERS: [f64; 23] = [
        1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17,
        1e18, 1e19, 1e20, 1e21, 1e22,
    ];
    let power = POWERS.get(exponent.unsigned_abs() as usize);
    if let (true, Some(power)) = (mantissa < 1 << 53, power) {
        return Some(if exponent < 0 { mantissa as f64 / power } else { mantissa as f64 * power });
    }
    format!("{mantissa}e{exponent}").parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn value(text: &str) -> Option<f64> {
        number(text.as_bytes()).map(|n| n.value)
    }

    #[test]
    fn suffixes_fold_into_the_exponent() {
        for (text, expected) in [
            ("1k", 1e3),
            ("4.7u", 4.7e-6),
            ("2.2MEG", 2.2e6),
            ("1M", 1e-3),
            ("1A", 1.0),
            ("10uF", 10e-6),
            ("-3.3", -3.3),
            (".5n", 0.5e-9),
            ("5.", 5.0),
            ("1e-3k", 1.0),
            ("1E3", 1e3),
            ("100µF", 100e-6),
            ("1mil", 25.4e-6),
            ("2T", 2e12),
            ("3Gohm", 3e9),
            ("7f", 7e-15),
            ("0.1p", 0.1e-12),
            ("1e", 1.0),
            ("3.9p", 3.9e-12),
            ("1kΩ", 1e3),
            ("123456789012345678901k", 1.234_567_890_123_456_8e23),
        ] {
            assert_eq!(value(text), Some(expected), "{text}");
        }
    }

    #[test]
    fn letter_code_of_iec_60062() {
        for (text, expected) in [
            ("4k7", 4.7e3),
            ("2R2", 2.2),
            ("4u7", 4.7e-6),
            ("4M7", 4.7e6),
            ("4m7", 4.7e-3),
            ("0R05", 0.05),
            ("-1k5", -1.5e3),
        ] {
            assert_eq!(value(text), Some(expected), "{text}");
        }
        assert!(plain_number(b"2N2222").is_none());
    }

    #[test]
    fn what_is_no_number() {
        for text in ["", "abc", ".", "-", "1.2.3", "1k5k5", "1e999", "+24V5V", "1/2"] {
            assert_eq!(value(text), None, "{text}");
        }
    }
}
