//! What the user may set for a run, as plain data: by options, and for a team in `kneewise.toml`, whose mistakes are
//! findings with a place in that file. Reading arguments is `cli`'s, and so is finding the file.

use crate::finding::{Edit, Finding, Severity, list};
use crate::text::{FileId, Span, nearest};
use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU32, Ordering};

/// Options of one analysis.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Options {
    /// `--drop`: one drop in volts for every diode.
    pub drop: Option<f64>,
    /// `--set NAME=VALUE`: sources held at a value (volts or amperes), in the order given.
    pub set: Vec<(String, f64)>,
    /// `--include-dir`: further places where includes may lie.
    pub include_dirs: Vec<PathBuf>,
    /// Find the states too (`check` and `states`), or only read and check the wiring.
    pub states: bool,
    /// The diode that `--why` asks about: its view is computed in parts of any size.
    pub why: Option<String>,
    /// Where the exponential law is asked beside the constant drop.
    pub opinion: SecondOpinion,
    /// Severities that differ from the rules' own, by rule name; `None` switches a rule off.
    pub levels: BTreeMap<String, Option<Severity>>,
    /// Decades of current (powers of ten) at which drops from models are held instead of the nearest one, by
    /// lower-case full name of the diode: a comparison judges both sides by the same drops.
    pub decades: BTreeMap<String, i32>,
    /// Where remarks begin.
    pub thresholds: Thresholds,
    /// Follow the circuit over time where its sources move, and gather what the conditions span; needs `states`.
    pub swing: bool,
    /// How much work over time is worth it, as a multiple of what `check` spends; 0 counts as 1.
    pub patience: u32,
    /// Through which another thread sees how far a long run has come, and ends it.
    pub monitor: Monitor,
}

/// Where the second opinion and the error bars are sought.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum SecondOpinion {
    /// In parts of up to 5,000 diodes.
    #[default]
    Usual,
    /// In all parts.
    Everywhere,
    /// Nowhere: states alone.
    Nowhere,
}

/// Where remarks begin, as `kneewise.toml` may set it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Thresholds {
    /// Share by which a current or voltage must move for `compare` to tell it: 0.05 is 5 %.
    pub moved: f64,
    /// Decades from the drop's own current beyond which a current is worth a note.
    pub swing_note: f64,
    /// The same, for a warning.
    pub swing_warning: f64,
}

impl Default for Thresholds {
    fn default() -> Self {
        Thresholds { moved: 0.05, swing_note: 1.0, swing_warning: 2.0 }
    }
}

/// Shared between a run and whoever waits for it. Clones are the same monitor.
#[derive(Debug, Clone, Default)]
pub struct Monitor(Arc<Shared>);

#[derive(Debug, Default)]
struct Shared {
    cancelled: AtomicBool,
    permille: AtomicU32,
}

impl Monitor {
    /// Asks the run to end soon; what it has found by then is told as cut short.
    pub fn cancel(&self) {
        self.0.cancelled.store(true, Ordering::Relaxed);
    }

    /// Whether somebody asked for the end.
    pub fn is_cancelled(&self) -> bool {
        self.0.cancelled.load(Ordering::Relaxed)
    }

    /// Share of the work over time that is done, at worst as much as is still ahead; 0 to 1000.
    pub fn permille(&self) -> u32 {
        self.0.permille.load(Ordering::Relaxed)
    }

    /// The run says how far it is.
    pub fn report(&self, permille: u32) {
        self.0.permille.store(permille, Ordering::Relaxed);
    }
}

/// A monitor is no setting: options that differ in nothing else are equal.
impl PartialEq for Monitor {
    fn eq(&self, _: &Self) -> bool {
        true
    }
}

/// Name of the file that a team's settings stand in.
pub const SETTINGS_FILE: &str = "kneewise.toml";

/// What `kneewise.toml` says. An option of the command line goes before it.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Settings {
    /// `[levels]`: severities by rule name; `None` for `"off"`.
    pub levels: BTreeMap<String, Option<Severity>>,
    /// `[thresholds]`.
    pub thresholds: Thresholds,
    /// `include-dirs`: further places where includes may lie, relative to the file.
    pub include_dirs: Vec<PathBuf>,
    /// `extensions`: what netlists end in, without the point; `None` where nothing is said.
    pub extensions: Option<Vec<String>>,
    /// `fail-on`: the least severity that makes the exit code 1.
    pub fail_on: Option<Severity>,
}

/// The keys of the file, of its `[thresholds]`, and the words of a level.
const KEYS: [&str; 5] = ["extensions", "fail-on", "include-dirs", "levels", "thresholds"];
const THRESHOLDS: [&str; 3] = ["moved", "swing-note", "swing-warning"];
const LEVELS: [&str; 4] = ["error", "warning", "note", "off"];

type Table<'t> = toml::de::DeTable<'t>;
type Place<T> = toml::Spanned<T>;
type Item<'t> = toml::de::DeValue<'t>;

/// Reads a settings file; `rules` are the names that may stand under `[levels]`. What cannot be used is a finding, and
/// the rest holds.
pub fn settings(text: &str, file: FileId, rules: &[&str]) -> (Settings, Vec<Finding>) {
    let mut reader = Reader { file, rules, settings: Settings::default(), findings: Vec::new() };
    let readable = reader.without_broken_lines(text);
    // what is left over is told already
    let (table, _) = Table::parse_recoverable(&readable);
    reader.root(table.get_ref());
    crate::finding::sort(&mut reader.findings);
    (reader.settings, reader.findings)
}

struct Reader<'a> {
    file: FileId,
    rules: &'a [&'a str],
    settings: Settings,
    findings: Vec<Finding>,
}

/// Broken lines that are told one by one.
const MOST_BROKEN: usize = 50;

impl Reader<'_> {
    /// The text with every line that is no TOML blanked out, each told; places stay what they were.
    fn without_broken_lines(&mut self, text: &str) -> String {
        let mut readable = text.to_owned();
        for _ in 0..MOST_BROKEN {
            let Err(error) = Table::parse(&readable) else { break };
            let span = error.span().unwrap_or(0..0);
            let message = format!("this is no TOML: {}", error.message().trim_end_matches('.'));
            let place = Span::new(self.file, span.start, span.end);
            self.findings.push(
                Finding::new("unreadable-settings", Severity::Error, place, message)
                    .label("not read")
                    .help("Settings are TOML (toml.io). Those that could be read hold; mend this one."),
            );
            let start = readable.get(..span.start).and_then(|t| t.rfind('\n')).map_or(0, |at| at + 1);
            let line = readable.get(start..).and_then(|t| t.split('\n').next()).unwrap_or("");
            let blank: String = " ".repeat(line.len());
            if *line == blank {
                break;
            }
            readable.replace_range(start..start + blank.len(), &blank);
        }
        readable
    }

    fn span<T>(&self, item: &Place<T>) -> Span {
        Span::new(self.file, item.span().start, item.span().end)
    }

    fn root(&mut self, table: &Table<'_>) {
        for (key, value) in table {
            match key.get_ref().as_ref() {
                "fail-on" => self.settings.fail_on = self.level(value, &LEVELS[..3]).flatten(),
                "include-dirs" => {
                    let words = self.words(value).unwrap_or_default();
                    self.settings.include_dirs = words.into_iter().map(PathBuf::from).collect();
                }
                "extensions" => self.extensions(value),
                "levels" => self.each(value, Self::rule_level),
                "thresholds" => self.each(value, Self::threshold),
                _ => self.unknown(key, "setting", &KEYS),
            }
        }
    }

    fn each(
        &mut self,
        value: &Place<Item<'_>>,
        read: fn(&mut Self, &Place<std::borrow::Cow<'_, str>>, &Place<Item<'_>>),
    ) {
        match value.get_ref().as_table() {
            Some(table) => table.iter().for_each(|(key, value)| read(self, key, value)),
            None => {
                self.unusable(value, "this is a table, such as `[levels]` with a line for each rule below it")
            }
        }
    }

    fn rule_level(&mut self, key: &Place<std::borrow::Cow<'_, str>>, value: &Place<Item<'_>>) {
        let rules = self.rules;
        if !rules.contains(&key.get_ref().as_ref()) {
            return self.unknown(key, "rule", rules);
        }
        if let Some(level) = self.level(value, &LEVELS) {
            self.settings.levels.insert(key.get_ref().to_string(), level);
        }
    }

    fn threshold(&mut self, key: &Place<std::borrow::Cow<'_, str>>, value: &Place<Item<'_>>) {
        let name = key.get_ref().as_ref();
        if !THRESHOLDS.contains(&name) {
            return self.unknown(key, "threshold", &THRESHOLDS);
        }
        let number = match value.get_ref() {
            Item::Integer(digits) => digits.as_str().parse::<f64>().ok(),
            Item::Float(digits) => digits.as_str().replace('_', "").parse().ok(),
            _ => None,
        };
        let Some(number) = number.filter(|n| n.is_finite() && *n >= 0.0) else {
            return self.unusable(value, "a threshold is a number, 0 or more");
        };
        match name {
            "moved" => self.settings.thresholds.moved = number,
            "swing-note" => self.settings.thresholds.swing_note = number,
            _ => self.settings.thresholds.swing_warning = number,
        }
    }

    fn extensions(&mut self, value: &Place<Item<'_>>) {
        let Some(words) = self.words(value) else { return };
        let bare: Vec<String> = words.iter().map(|w| w.trim_start_matches('.').to_owned()).collect();
        if bare.is_empty() || bare.iter().any(String::is_empty) {
            return self.unusable(value, "this is a list of endings, such as [\"net\", \"cir\"]");
        }
        self.settings.extensions = Some(bare);
    }

    /// A list of texts.
    fn words(&mut self, value: &Place<Item<'_>>) -> Option<Vec<String>> {
        let texts: Option<Vec<String>> = value
            .get_ref()
            .as_array()
            .and_then(|list| list.iter().map(|item| item.get_ref().as_str().map(str::to_owned)).collect());
        if texts.is_none() {
            self.unusable(value, "this is a list of texts, such as [\"parts\", \"models\"]");
        }
        texts
    }

    /// The severity that a word stands for; the inner `None` is `off`.
    fn level(&mut self, value: &Place<Item<'_>>, words: &[&str]) -> Option<Option<Severity>> {
        let word = value.get_ref().as_str().unwrap_or("");
        match words.contains(&word).then_some(word) {
            Some("error") => Some(Some(Severity::Error)),
            Some("warning") => Some(Some(Severity::Warning)),
            Some("note") => Some(Some(Severity::Note)),
            Some(_) => Some(None),
            None => {
                let quoted: Vec<String> = words.iter().map(|w| format!("\"{w}\"")).collect();
                self.unusable(value, &format!("this is one of {}", list(&quoted, quoted.len())));
                None
            }
        }
    }

    fn unusable<T>(&mut self, value: &Place<T>, wanted: &str) {
        let finding = Finding::new("unusable-setting", Severity::Warning, self.span(value), wanted)
            .label("not used")
            .help("Until it is mended, what holds without this setting holds.");
        self.findings.push(finding);
    }

    fn unknown(&mut self, key: &Place<std::borrow::Cow<'_, str>>, what: &str, known: &[&str]) {
        let span = self.span(key);
        let name = key.get_ref().as_ref();
        let mut finding =
            Finding::new("unknown-setting", Severity::Warning, span, format!("there is no {what} `{name}`"))
                .label("has no effect")
                .about(name);
        finding.help = match nearest(name, known.iter().copied()) {
            Some(near) => {
                let edits = vec![Edit { span, replacement: near.to_owned() }];
                finding = finding.fix(format!("write `{near}`"), edits);
                format!("Did you mean `{near}`? Until it is mended it has no effect.")
            }
            None if known.len() <= KEYS.len() => {
                let names: Vec<String> = known.iter().map(|k| format!("`{k}`")).collect();
                format!("Known are {}.", list(&names, names.len()))
            }
            None => "`kneewise rules` lists them.".into(),
        };
        self.findings.push(finding);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> (Settings, Vec<Finding>) {
        settings(text, FileId(0), &["dangling-node", "never-conducts"])
    }

    #[test]
    fn every_setting_is_read() {
        let text = "fail-on = \"error\"\ninclude-dirs = [\"parts\"]\nextensions = [\".net\", \"lst\"]\n\
                    [levels]\ndangling-node = \"off\"\nnever-conducts = \"note\"\n\
                    [thresholds]\nmoved = 0.1\nswing-note = 2\n";
        let (settings, findings) = read(text);
        assert!(findings.is_empty(), "{findings:?}");
        assert_eq!(settings.fail_on, Some(Severity::Error));
        assert_eq!(settings.include_dirs, [PathBuf::from("parts")]);
        assert_eq!(settings.extensions, Some(vec!["net".to_owned(), "lst".to_owned()]));
        assert_eq!(settings.levels["dangling-node"], None);
        assert_eq!(settings.levels["never-conducts"], Some(Severity::Note));
        assert_eq!((settings.thresholds.moved, settings.thresholds.swing_note), (0.1, 2.0));
        assert_eq!(read(""), (Settings::default(), Vec::new()));
    }

    #[test]
    fn what_is_not_known_is_told_with_its_neighbour_and_the_rest_holds() {
        let text = "fail_on = \"error\"\n[levels]\ndangling-nod = \"off\"\nnever-conducts = \"off\"\n\
                    [thresholds]\nmovde = 1\nhum = 2\n";
        let (settings, findings) = read(text);
        let told: Vec<(&str, &str, &str)> =
            findings.iter().map(|f| (f.rule, &text[f.span.range()], f.help.as_str())).collect();
        assert_eq!(
            told,
            [
                (
                    "unknown-setting",
                    "fail_on",
                    "Did you mean `fail-on`? Until it is mended it has no effect."
                ),
                (
                    "unknown-setting",
                    "dangling-nod",
                    "Did you mean `dangling-node`? Until it is mended it has no effect."
                ),
                ("unknown-setting", "movde", "Did you mean `moved`? Until it is mended it has no effect."),
                ("unknown-setting", "hum", "Known are `moved`, `swing-note` and `swing-warning`."),
            ]
        );
        assert_eq!(settings.levels["never-conducts"], None);
    }

    #[test]
    fn what_cannot_be_used_is_told_at_its_place() {
        let text = "fail-on = \"off\"\nextensions = \"net\"\nlevels = 3\n[thresholds]\nmoved = -1\n";
        let (settings, findings) = read(text);
        let told: Vec<(&str, &str)> = findings.iter().map(|f| (f.rule, &text[f.span.range()])).collect();
        let rule = "unusable-setting";
        assert_eq!(told, [(rule, "\"off\""), (rule, "\"net\""), (rule, "3"), (rule, "-1")]);
        assert_eq!(settings, Settings::default());
    }

    #[test]
    fn a_line_that_is_no_toml_is_told_and_the_others_hold() {
        let text = "fail-on = \"error\"\nthis is none\n[levels]\nnever-conducts = \"off\"\n";
        let (settings, findings) = read(text);
        assert_eq!(findings[0].rule, "unreadable-settings", "{findings:?} {settings:?}");
        assert_eq!(findings.len(), 1, "{findings:?} {settings:?}");
        assert_eq!(settings.fail_on, Some(Severity::Error));
        assert_eq!(settings.levels["never-conducts"], None);
    }
}
