//! The traps that written numbers set: letters read otherwise than meant, units of another quantity, sizes that
//! no part has.

use super::behaviour::Value;
use super::expand::Expander;
use super::line::Line;
use super::parameter::Worth;
use crate::finding::{Edit, Finding, Severity, quantity};
use crate::syntax::{self, Behind, Number, Token, Unit};

/// What kind of quantity a value is read for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Quantity {
    Ohms,
    Farads,
    Henries,
    Volts,
    Amperes,
    Plain,
}

impl Quantity {
    fn word(self) -> &'static str {
        match self {
            Quantity::Ohms => "a resistance",
            Quantity::Farads => "a capacitance",
            Quantity::Henries => "an inductance",
            Quantity::Volts => "a voltage",
            Quantity::Amperes => "a current",
            Quantity::Plain => "a number",
        }
    }

    fn symbol(self) -> &'static str {
        match self {
            Quantity::Ohms => "Ω",
            Quantity::Farads => "F",
            Quantity::Henries => "H",
            Quantity::Volts => "V",
            Quantity::Amperes => "A",
            Quantity::Plain => "",
        }
    }

    /// A magnitude that no part reaches (and that no one writes on purpose, as some do with a 1e12 H choke).
    fn largest(self) -> f64 {
        match self {
            Quantity::Ohms => 1e16,
            Quantity::Farads => 1e5,
            Quantity::Henries => 1e13,
            Quantity::Volts | Quantity::Amperes => 1e12,
            Quantity::Plain => f64::INFINITY,
        }
    }
}

/// A value that is looked at for traps: whose it is, what it is, how it is written.
#[derive(Clone, Copy)]
struct Suspect<'t> {
    name: &'t str,
    value: Value,
    quantity: Quantity,
    text: &'t str,
    /// Whether it is written on the line itself, and not a parameter's.
    is_own: bool,
}

impl Suspect<'_> {
    /// The value as it is read, with its unit.
    fn read(&self) -> String {
        quantity(self.value.number, self.quantity.symbol())
    }
}

impl Expander<'_> {
    /// What a token is worth, its value judged for its traps.
    pub(super) fn value(&mut self, line: &Line<'_>, token: Token, quantity: Quantity) -> Worth {
        let worth = self.worth(line.at(token));
        if let Worth::Is(value) = worth {
            let text = self.sources().slice(value.span);
            let own = line.at(token);
            let is_own =
                own.file == value.span.file && own.start <= value.span.start && value.span.end <= own.end;
            self.judge(Suspect { name: line.word_str(0), value, quantity, text, is_own });
        }
        worth
    }

    /// Warns where a value is likely misread.
    fn judge(&mut self, suspect: Suspect<'_>) {
        let Suspect { value, quantity, text, .. } = suspect;
        if value.number.abs() >= quantity.largest() {
            self.tell_size(suspect);
        }
        // nearly all values hold only digits and a small scale letter, and set no trap
        let harmless = |b| matches!(b, b'0'..=b'9' | b'.' | b'-' | b'e' | b'k' | b'm' | b'u' | b'n' | b'p');
        let letters = text.bytes().filter(u8::is_ascii_lowercase).count();
        if !value.written || text.bytes().all(harmless) && letters < 2 {
            return;
        }
        if quantity == Quantity::Plain {
            if suspect.is_own {
                self.judge_number(suspect.name, value.span);
            }
            return;
        }
        let Some(number) = syntax::number(text.as_bytes()) else { return };
        let suffix = text.get(number.digits..number.digits + number.suffix).unwrap_or("");
        let unit = text.get(number.length()..).unwrap_or("");
        let behind = syntax::behind(text, number);
        match (suffix, quantity) {
            ("M", _) if number.letter_code => self.tell_mega_code(suspect),
            _ if number.letter_code || behind.is_slip() => self.judge_unit(suspect, behind),
            ("M", Quantity::Ohms) => {
                self.tell_misread(suspect, "milli", &format!("{}Meg", digits(text, number)))
            }
            ("F", Quantity::Farads) if unit.is_empty() => {
                self.tell_misread(suspect, "femto", digits(text, number))
            }
            ("F" | "f", Quantity::Farads) if is_farad(unit) => {
                self.tell_misread(suspect, "femto", digits(text, number))
            }
            ("F" | "f", Quantity::Ohms | Quantity::Henries) if unit.is_empty() || is_farad(unit) => {
                self.tell_unit(suspect, "farads")
            }
            // 10E is 10 Ω to some
            ("", Quantity::Ohms) if unit.eq_ignore_ascii_case("e") => {}
            _ => self.judge_unit(suspect, behind),
        }
    }

    fn judge_unit(&mut self, suspect: Suspect<'_>, behind: Behind<'_>) {
        match behind {
            Behind::Unit(unit) => {
                if let Some(other) = other_unit(unit, suspect.quantity) {
                    self.tell_unit(suspect, other);
                }
            }
            behind if suspect.is_own => {
                self.tell_behind(suspect.name, suspect.value.span, &suspect.read(), behind);
            }
            _ => {}
        }
    }

    fn tell_misread(&mut self, suspect: Suspect<'_>, scale: &str, meant: &str) {
        let Suspect { name, value, text, .. } = suspect;
        let read = suspect.read();
        let letter = text.chars().find(char::is_ascii_alphabetic).unwrap_or('M');
        let message = format!("{name} is {read}: in {text} the {letter} means {scale}, whatever its case");
        let finding = Finding::new("misread-value", Severity::Warning, value.span, message)
            .label(format!("read as {read}"))
            .about(self.here(name))
            .help(format!(
                "Write `{meant}` if that is what was meant, or the value in another scale if it was not."
            ))
            .fix(format!("write `{meant}`"), vec![Edit { span: value.span, replacement: meant.to_owned() }]);
        self.tell(finding);
    }

    fn tell_mega_code(&mut self, suspect: Suspect<'_>) {
        let Suspect { name, value, text, .. } = suspect;
        let read = suspect.read();
        let message = format!(
            "the {text} of {name} is read as {read}: between digits, by the letter code of IEC 60062, M is mega"
        );
        let finding = Finding::new("mega-in-letter-code", Severity::Note, value.span, message)
            .label(format!("read as {read}"))
            .about(self.here(name))
            .help("Behind a number M means milli; write Meg to leave no doubt.");
        self.tell(finding);
    }

    fn tell_unit(&mut self, suspect: Suspect<'_>, unit: &str) {
        let Suspect { name, value, text, quantity, .. } = suspect;
        let read = suspect.read();
        let message = format!(
            "the {text} of {name} is in {unit} where {} belongs; unit letters are ignored, so it is {read}",
            quantity.word()
        );
        let finding = Finding::new("wrong-unit", Severity::Warning, value.span, message)
            .label(format!("read as {read}"))
            .about(self.here(name))
            .help("Correct the value, or the letter that the element's name begins with.");
        self.tell(finding);
    }

    fn tell_size(&mut self, suspect: Suspect<'_>) {
        let Suspect { name, value, text, quantity, .. } = suspect;
        let read = suspect.read();
        let message = format!("the {text} of {name} gives {} of {read}, which no part has", quantity.word());
        let finding = Finding::new("value-out-of-scale", Severity::Warning, value.span, message)
            .label(format!("read as {read}"))
            .about(self.here(name))
            .help("A scale letter is probably missing or wrong.");
        self.tell(finding);
    }
}

fn digits(text: &str, number: Number) -> &str {
    text.get(..number.digits).unwrap_or(text)
}

/// What is left of `1Farad` when its F is taken for femto.
fn is_farad(unit: &str) -> bool {
    unit.eq_ignore_ascii_case("arad") || unit.eq_ignore_ascii_case("arads")
}

/// The plural of a unit that measures something else than what is wanted.
fn other_unit(unit: Unit, wanted: Quantity) -> Option<&'static str> {
    let (quantity, word) = match unit {
        Unit::Farad => (Some(Quantity::Farads), "farads"),
        Unit::Henry => (Some(Quantity::Henries), "henries"),
        Unit::Ohm => (Some(Quantity::Ohms), "ohms"),
        Unit::Volt => (Some(Quantity::Volts), "volts"),
        Unit::Ampere => (Some(Quantity::Amperes), "amperes"),
        Unit::Hertz => (None, "hertz"),
        Unit::Second => (None, "seconds"),
        Unit::Watt => (None, "watts"),
        Unit::Metre => (None, "metres"),
        Unit::Celsius | Unit::Plain => return None,
    };
    (quantity != Some(wanted)).then_some(word)
}
