//! The arguments, as the user sees them in `--help`.

use clap::builder::styling::{AnsiColor, Style, Styles};
use clap::{Args as Group, ColorChoice, Parser, Subcommand, ValueEnum};
use kneewise::config::Options;
use kneewise::finding::Severity;
use std::path::PathBuf;

const STYLES: Styles = Styles::styled()
    .header(AnsiColor::Cyan.on_default().bold())
    .usage(AnsiColor::Cyan.on_default().bold())
    .literal(Style::new().bold())
    .placeholder(AnsiColor::Green.on_default());

const EXIT: &str = "\
Exit code: 0 nothing at or above --fail-on, 1 something is, 2 the job could not be done.";

/// Reads circuit netlists: is it wired properly, does every diode point the right way, and which diodes
/// conduct, block or break down? Every answer is proved by putting it back into the circuit laws.
#[derive(Debug, Parser)]
#[command(name = "kneewise", version, styles = STYLES, after_help = EXIT, max_term_width = 100)]
#[command(disable_help_subcommand = true)]
pub struct Args {
    /// When to colour the output
    #[arg(long, global = true, value_name = "WHEN", default_value = "auto")]
    pub color: ColorChoice,
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub enum Command {
    /// Check netlists: wiring, direction of diodes, operating point
    #[command(after_help = "\
Examples:
  kneewise check boards/                    every .net, .cir and .ckt below
  kneewise check charger.net --fail-on error
  generate-netlist | kneewise check -")]
    Check(Check),
    /// Show every diode's state, voltage, current, drop and margin
    #[command(after_help = "\
Examples:
  kneewise states charger.net --set VIN=9
  kneewise states charger.net --why D3      the reasoning, step by step
  kneewise states charger.net --drop 0.7    one drop for all, as in hand calculation")]
    States(States),
    /// Show how far currents and voltages move: over time, and over the conditions
    #[command(after_help = "\
Examples:
  kneewise swing supply.net                 conduction, peaks, ripple in the periodic state
  kneewise swing supply.net --plot run.svg  the same as a picture")]
    Swing(Swing),
    /// List the rules, or tell one in full with its examples
    #[command(after_help = "\
Example:
  kneewise rules never-conducts")]
    Rules(Rules),
}

#[derive(Debug, Group)]
pub struct Check {
    /// Netlists or directories; `-` is standard input
    #[arg(required = true, value_name = "PATH")]
    pub paths: Vec<PathBuf>,
    #[command(flatten)]
    pub common: Common,
}

#[derive(Debug, Group)]
pub struct States {
    /// A netlist; `-` is standard input
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Tell why this diode is in its state
    #[arg(long, value_name = "DIODE")]
    pub why: Option<String>,
    #[command(flatten)]
    pub common: Common,
}

#[derive(Debug, Group)]
pub struct Swing {
    /// A netlist; `-` is standard input
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Draw it into this file: .svg, or .html
    #[arg(long, value_name = "PICTURE", value_parser = picture)]
    pub plot: Option<PathBuf>,
    #[command(flatten)]
    pub common: Common,
}

#[derive(Debug, Group)]
pub struct Rules {
    /// The rule to tell in full
    pub name: Option<String>,
}

#[derive(Debug, Group)]
pub struct Common {
    /// Text for people, or JSON for programs
    #[arg(long, value_enum, default_value = "text")]
    pub format: Format,
    /// One drop for every diode, in volts
    #[arg(long, value_name = "VOLTS", value_parser = drop_volts)]
    pub drop: Option<f64>,
    /// Hold a source at a value; may be repeated
    #[arg(long, value_name = "NAME=VALUE", value_parser = setting)]
    pub set: Vec<(String, f64)>,
    /// The least severity that makes the exit code 1
    #[arg(long, value_enum, value_name = "SEVERITY", default_value = "warning")]
    pub fail_on: FailOn,
    /// A further directory to look for included files; may be repeated
    #[arg(long, value_name = "DIR")]
    pub include_dir: Vec<PathBuf>,
}

impl Common {
    /// What the analysis is to do.
    pub fn options(&self, why: Option<&str>) -> Options {
        Options {
            drop: self.drop,
            set: self.set.clone(),
            include_dirs: self.include_dir.clone(),
            states: true,
            why: why.map(str::to_owned),
            ..Options::default()
        }
    }
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Format {
    Text,
    Json,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum FailOn {
    Error,
    Warning,
    Note,
}

impl FailOn {
    /// Whether something of this severity makes the exit code 1.
    pub fn reached_by(self, worst: Option<Severity>) -> bool {
        let limit = match self {
            FailOn::Error => Severity::Error,
            FailOn::Warning => Severity::Warning,
            FailOn::Note => Severity::Note,
        };
        worst.is_some_and(|w| w >= limit)
    }
}

/// A number as netlists write it: `650m`, `4k7`.
fn value(text: &str) -> Result<f64, String> {
    let number = kneewise::syntax::number(text.trim().as_bytes()).map(|n| n.value);
    number
        .filter(|n| n.is_finite())
        .ok_or_else(|| format!("`{text}` is not a number as netlists write it, such as 12, 650m or 4k7"))
}

fn drop_volts(text: &str) -> Result<f64, String> {
    match value(text)? {
        volts if volts < 0.0 => Err("a drop is a forward voltage, so it cannot be negative".into()),
        volts => Ok(volts),
    }
}

fn picture(text: &str) -> Result<PathBuf, String> {
    let path = PathBuf::from(text);
    let ending = path.extension().and_then(|e| e.to_str()).map(str::to_ascii_lowercase);
    match ending.as_deref() {
        Some("svg" | "html" | "htm") => Ok(path),
        _ => Err("a picture is written as .svg or .html".into()),
    }
}

fn setting(text: &str) -> Result<(String, f64), String> {
    match text.split_once('=') {
        Some((name, number)) if !name.trim().is_empty() => Ok((name.trim().to_owned(), value(number)?)),
        _ => Err("write NAME=VALUE, such as VIN=9".into()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_definition_is_sound() {
        Args::command().debug_assert();
    }

    #[test]
    fn settings_name_a_source_and_a_value() {
        assert_eq!(setting("VIN=9"), Ok(("VIN".into(), 9.0)));
        assert_eq!(setting("RL=4k7"), Ok(("RL".into(), 4700.0)));
        assert_eq!(setting("v2 = 650mV"), Ok(("v2".into(), 0.65)));
        assert!(setting("VIN").is_err());
        assert!(setting("=9").is_err());
        assert!(setting("VIN=nine").is_err());
        assert!(drop_volts("-0.7").is_err());
    }
}
