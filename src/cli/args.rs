//! The arguments, as the user sees them in `--help`.

use super::settings::Found;
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
    /// Put a mark with its state behind every diode of a netlist
    #[command(after_help = "\
Examples:
  kneewise annotate charger.net             shows it, changes nothing
  kneewise annotate charger.net --write     puts the marks into the file, and into what it includes
  kneewise annotate boards/ --verify        fails when a mark is out of date

A file that several netlists include gets one mark a diode for all that are named, so name them all, \
or their directory.

Exit code: 0 done, 1 marks are out of date (--verify), 2 the job could not be done.")]
    Annotate(Annotate),
    /// Tell what a change does electrically: states that flip, what moves, findings that come and go
    #[command(override_usage = "kneewise compare [OPTIONS] <OLD> <NEW>")]
    #[command(after_help = "\
Examples:
  kneewise compare old/charger.net charger.net
  kneewise compare main/boards boards --format markdown

It also takes the seven arguments with which version control calls an external comparison; then the \
exit code is 0 whatever differs.")]
    Compare(Compare),
    /// List the rules, or tell one in full with its examples
    #[command(after_help = "\
Example:
  kneewise rules never-conducts")]
    Rules(Rules),
    /// Print completions for a shell
    #[command(hide = true)]
    Completions { shell: clap_complete::Shell },
    /// Print the manual page, in roff
    #[command(hide = true)]
    Manual,
}

#[derive(Debug, Group)]
pub struct Check {
    /// Netlists or directories; `-` is standard input
    #[arg(required = true, value_name = "PATH")]
    pub paths: Vec<PathBuf>,
    /// Text for people, JSON for programs, SARIF for code review, Markdown for a comment
    #[arg(long, value_enum, default_value = "text")]
    pub format: CheckFormat,
    /// Tell only what this older file, directory or saved JSON does not have
    #[arg(long, value_name = "OLD")]
    pub against: Option<PathBuf>,
    /// List the findings that notes accept too, with their reasons
    #[arg(long)]
    pub accepted: bool,
    #[command(flatten)]
    pub common: Common,
}

#[derive(Debug, Group)]
pub struct Annotate {
    /// Netlists or directories; several with --write or --verify only; `-` is standard input
    #[arg(required = true, value_name = "FILE")]
    pub files: Vec<PathBuf>,
    /// Put the marks into the files themselves
    #[arg(long)]
    pub write: bool,
    /// Change nothing; fail when a mark is out of date or missing
    #[arg(long, conflicts_with = "write")]
    pub verify: bool,
    /// Take all marks away instead
    #[arg(long, conflicts_with = "verify")]
    pub strip: bool,
    #[command(flatten)]
    pub circuit: CircuitOptions,
}

#[derive(Debug, Group)]
pub struct Compare {
    /// The older netlist, or a directory of them
    #[arg(value_name = "OLD")]
    pub old: PathBuf,
    /// The newer netlist, or directory
    #[arg(value_name = "NEW", required = !is_called())]
    pub new: Option<PathBuf>,
    /// What version control says of them besides
    #[arg(hide = true, num_args = 0..=7)]
    pub rest: Vec<PathBuf>,
    /// Text for people, JSON for programs, Markdown for a comment
    #[arg(long, value_enum, default_value = "text")]
    pub format: CompareFormat,
    /// Share by which a current or voltage must move to be told, such as 0.1 or 10% [default: 5%]
    #[arg(long, value_name = "SHARE", value_parser = share, allow_negative_numbers = true)]
    pub moved: Option<f64>,
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
    /// Ask the exponential law in parts of more than 5,000 diodes too
    #[arg(long)]
    pub second_opinion: bool,
    /// Text for people, or JSON for programs
    #[arg(long, value_enum, default_value = "text")]
    pub format: Format,
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
    /// Text for people, or JSON for programs
    #[arg(long, value_enum, default_value = "text")]
    pub format: Format,
    #[command(flatten)]
    pub common: Common,
}

#[derive(Debug, Group)]
pub struct Rules {
    /// The rule to tell in full
    pub name: Option<String>,
}

/// What every command takes that judges.
#[derive(Debug, Group)]
pub struct Common {
    #[command(flatten)]
    pub circuit: CircuitOptions,
    /// The least severity that makes the exit code 1 [default: warning]
    #[arg(long, value_enum, value_name = "SEVERITY")]
    pub fail_on: Option<FailOn>,
}

impl Common {
    /// Whether something of this severity makes the exit code 1; the option goes before the settings.
    pub fn fails_on(&self, found: Option<&Found>, worst: Option<Severity>) -> bool {
        let option = self.fail_on.map(FailOn::severity);
        let limit = option.or(found.and_then(|f| f.settings.fail_on)).unwrap_or(Severity::Warning);
        worst.is_some_and(|w| w >= limit)
    }
}

/// How circuits are read and examined.
#[derive(Debug, Group)]
pub struct CircuitOptions {
    /// One drop for every diode, in volts
    #[arg(long, value_name = "VOLTS", value_parser = drop_volts, allow_negative_numbers = true)]
    pub drop: Option<f64>,
    /// Hold a source at a value; may be repeated
    #[arg(long, value_name = "NAME=VALUE", value_parser = setting)]
    pub set: Vec<(String, f64)>,
    /// A further directory to look for included files; may be repeated
    #[arg(long, value_name = "DIR")]
    pub include_dir: Vec<PathBuf>,
    /// Settings to use instead of the nearest kneewise.toml
    #[arg(long, value_name = "FILE")]
    pub config: Option<PathBuf>,
}

impl CircuitOptions {
    /// What the analysis is to do with a file for which these settings hold.
    pub fn options(&self, found: Option<&Found>) -> Options {
        let mut include_dirs = self.include_dir.clone();
        include_dirs
            .extend(found.iter().flat_map(|f| f.settings.include_dirs.iter().map(|d| f.base.join(d))));
        Options {
            drop: self.drop,
            set: self.set.clone(),
            include_dirs,
            states: true,
            levels: found.map(|f| f.settings.levels.clone()).unwrap_or_default(),
            thresholds: found.map(|f| f.settings.thresholds).unwrap_or_default(),
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
pub enum CompareFormat {
    Text,
    Json,
    Markdown,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum CheckFormat {
    Text,
    Json,
    Sarif,
    Markdown,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum FailOn {
    Error,
    Warning,
    Note,
}

impl FailOn {
    fn severity(self) -> Severity {
        match self {
            FailOn::Error => Severity::Error,
            FailOn::Warning => Severity::Warning,
            FailOn::Note => Severity::Note,
        }
    }
}

/// Whether version control runs this as its external comparison.
pub fn is_called() -> bool {
    std::env::var_os("GIT_DIFF_PATH_COUNTER").is_some()
}

impl Compare {
    /// All paths in their order.
    pub fn paths(&self) -> Vec<PathBuf> {
        std::iter::once(&self.old).chain(&self.new).chain(&self.rest).cloned().collect()
    }
}

/// A number as netlists write it: `650m`, `4k7`.
fn value(text: &str) -> Result<f64, String> {
    let number = kneewise::syntax::sound_number(text.trim()).map(|n| n.value);
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

/// `0.1` or `10%`.
fn share(text: &str) -> Result<f64, String> {
    let (digits, scale) = text.strip_suffix('%').map_or((text, 1.0), |percent| (percent, 0.01));
    let number = digits.trim().parse::<f64>().ok().map(|n| n * scale);
    number
        .filter(|n| n.is_finite() && *n >= 0.0)
        .ok_or_else(|| format!("`{text}` is no share, such as 0.1 or 10%"))
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
