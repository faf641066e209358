//! What stands behind a number and its scale letter: a unit, which is ignored, or something that cannot belong there.
//! Which unit fits which element is for `circuit` to say.

use super::number::{Number, number};

/// What a unit measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unit {
    Ohm,
    Farad,
    Henry,
    Volt,
    Ampere,
    Hertz,
    Second,
    Watt,
    Metre,
    Celsius,
    /// A share, an angle, a ratio.
    Plain,
}

/// What stands behind a number and its scale letter.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Behind<'t> {
    /// Nothing.
    Nothing,
    /// A unit.
    Unit(Unit),
    /// A letter that looks like a digit: as the whole number would be written with it.
    Digit(String),
    /// Another scale letter, as in `4k7k`.
    Scale(&'t str),
    /// Something else.
    Other(&'t str),
}

impl Behind<'_> {
    /// Whether it is a slip of the pen wherever it stands: a letter for a digit, or one scale too many.
    pub fn is_slip(&self) -> bool {
        matches!(self, Behind::Digit(_) | Behind::Scale(_))
    }
}

/// What stands behind `read`, which is how `text` reads.
pub fn behind(text: &str, read: Number) -> Behind<'_> {
    let end = read.length();
    let Some(rest) = text.get(end..).filter(|rest| !rest.is_empty()) else { return Behind::Nothing };
    let word = rest.trim_matches('_');
    let scale = text.get(read.digits..end).filter(|_| !read.letter_code).unwrap_or("");
    if let Some(unit) = unit(word).or_else(|| unit(without_scale_name(scale, word))) {
        return Behind::Unit(unit);
    }
    // behind a scale letter they would make a letter code of it
    if let Some(meant) = digits_meant(text, end).filter(|_| read.suffix == 0 || read.letter_code) {
        return Behind::Digit(meant);
    }
    if is_scale(word) { Behind::Scale(word) } else { Behind::Other(rest) }
}

/// A number in which no letter stands for a digit and no scale follows another.
pub fn sound_number(text: &str) -> Option<Number> {
    number(text.as_bytes()).filter(|read| !behind(text, *read).is_slip())
}

/// The text with letters that look like digits written as digits, where that makes a sound number of what was none.
pub fn number_meant(text: &str) -> Option<String> {
    let meant: String = text.chars().map(|c| digit(c).unwrap_or(c)).collect();
    let read = number(meant.as_bytes())?;
    let is_sound = matches!(behind(&meant, read), Behind::Nothing | Behind::Unit(_));
    (meant != text && is_sound).then_some(meant)
}

fn digit(letter: char) -> Option<char> {
    match letter {
        'O' | 'o' => Some('0'),
        'l' | 'I' => Some('1'),
        _ => None,
    }
}

/// The text with the letters from byte `at` on that look like digits written as digits; `None` where there are none, or
/// where the result is no sound number either.
fn digits_meant(text: &str, at: usize) -> Option<String> {
    let (head, rest) = text.split_at_checked(at)?;
    let longest = rest.chars().take_while(|c| digit(*c).is_some()).count();
    // the last of them may begin `ohm`
    (1..=longest).rev().find_map(|run| {
        let digits: String = rest.chars().take(run).filter_map(digit).collect();
        let meant = format!("{head}{digits}{}", rest.get(run..)?);
        let read = number(meant.as_bytes())?;
        matches!(behind(&meant, read), Behind::Nothing | Behind::Unit(_)).then_some(meant)
    })
}

/// What is left of a scale's name behind its letters: the `ilo` of `10kilo`, the `a` of `1megaohm`.
fn without_scale_name<'t>(scale: &str, word: &'t str) -> &'t str {
    let name = match scale.to_ascii_lowercase().as_str() {
        "k" => "ilo",
        "meg" => "a",
        "g" => "iga",
        "t" => "era",
        "n" => "ano",
        "p" => "ico",
        "f" => "emto",
        _ => return word,
    };
    match word.split_at_checked(name.len()) {
        Some((head, tail)) if head.eq_ignore_ascii_case(name) => tail,
        _ => word,
    }
}

/// `scale`, with or without a unit behind it.
fn is_scale(word: &str) -> bool {
    let lower = word.to_lowercase();
    let scales = ["meg", "mil", "k", "m", "u", "\u{b5}", "\u{3bc}", "n", "p", "g", "t"];
    scales.iter().any(|scale| lower.strip_prefix(scale).is_some_and(|rest| unit(rest).is_some()))
}

/// `unit = ohm / farad / henry / volt / ampere / hertz / second / watt / metre / celsius / plain-unit`
fn unit(word: &str) -> Option<Unit> {
    Some(match word.to_lowercase().as_str() {
        // `kilohm` has one o less
        "ohm" | "ohms" | "\u{3c9}" | "r" | "ilohm" | "ilohms" => Unit::Ohm,
        "f" | "farad" | "farads" => Unit::Farad,
        "h" | "hy" | "henry" | "henries" | "henrys" => Unit::Henry,
        "v" | "volt" | "volts" | "vdc" | "vac" | "vp" | "vpk" | "vpp" | "vrms" => Unit::Volt,
        "a" | "amp" | "amps" | "ampere" | "amperes" | "adc" | "aac" | "ap" | "apk" | "app" | "arms" => {
            Unit::Ampere
        }
        "hz" | "hertz" => Unit::Hertz,
        "s" | "sec" | "secs" | "second" | "seconds" => Unit::Second,
        "w" | "watt" | "watts" => Unit::Watt,
        "m" | "meter" | "meters" | "metre" | "metres" => Unit::Metre,
        "c" | "\u{b0}c" | "degc" | "celsius" => Unit::Celsius,
        "" | "%" | "\u{b0}" | "deg" | "degree" | "degrees" | "rad" | "db" | "j" => Unit::Plain,
        _ => return None,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn told(text: &str) -> Behind<'_> {
        behind(text, number(text.as_bytes()).unwrap())
    }

    #[test]
    fn honest_units_are_units() {
        for (text, unit) in [
            ("10kohm", Unit::Ohm),
            ("5V", Unit::Volt),
            ("100nF", Unit::Farad),
            ("1MEGohm", Unit::Ohm),
            ("1megaohm", Unit::Ohm),
            ("10kilohm", Unit::Ohm),
            ("4k7Ω", Unit::Ohm),
            ("1k\u{2126}", Unit::Ohm),
            ("10_ohm", Unit::Ohm),
            ("1nanofarad", Unit::Farad),
            ("10uH", Unit::Henry),
            ("230Vrms", Unit::Volt),
            ("20mAmps", Unit::Ampere),
            ("50Hz", Unit::Hertz),
            ("1usec", Unit::Second),
            ("10um", Unit::Metre),
            ("85°C", Unit::Celsius),
            ("5%", Unit::Plain),
        ] {
            assert_eq!(told(text), Behind::Unit(unit), "{text}");
        }
        for text in ["2k2", "10", "1.5k", "4R7", "1e3"] {
            assert_eq!(told(text), Behind::Nothing, "{text}");
        }
    }

    #[test]
    fn letters_for_digits_are_seen() {
        for (text, meant) in [
            ("1O", "10"),
            ("1OO", "100"),
            ("1Ok", "10k"),
            ("4.7o", "4.70"),
            ("1l", "11"),
            ("1I0k", "110k"),
            ("1Oohm", "10ohm"),
        ] {
            if let Some(read) = number(text.as_bytes()) {
                assert_eq!(behind(text, read), Behind::Digit(meant.to_owned()), "{text}");
            } else {
                assert_eq!(number_meant(text).as_deref(), Some(meant), "{text}");
            }
        }
        assert_eq!(number_meant("4O7"), Some("407".to_owned()));
        assert_eq!(number_meant("10k"), None);
        assert_eq!(number_meant("mode1"), None);
    }

    #[test]
    fn a_scale_behind_a_scale_is_seen() {
        for (text, scale) in [
            ("4k7k", "k"),
            ("10kk", "k"),
            ("4n7n", "n"),
            ("10_k", "k"),
            ("1kMeg", "Meg"),
            ("2k2kohm", "kohm"),
        ] {
            // `10_k` has no scale of its own, and its k is none
            assert_eq!(told(text), Behind::Scale(scale), "{text}");
        }
        assert_eq!(told("10foo"), Behind::Other("oo"));
        assert_eq!(told("12Vin"), Behind::Other("Vin"));
    }
}
