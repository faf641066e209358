//! Finds the settings of each file: `kneewise.toml` in its directory or one above, up to the repository it lies in, or
//! the file that `--config` names. What a setting means is the library's.

use super::args::CircuitOptions;
use kneewise::config::{SETTINGS_FILE, Settings, settings};
use kneewise::finding::{Finding, Severity};
use kneewise::review::Record;
use kneewise::rules;
use kneewise::text::{FileId, Sources, Span, trouble};
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// One settings file, read.
#[derive(Debug)]
pub struct Found {
    /// What it says.
    pub settings: Settings,
    /// Its directory, which the paths in it are relative to.
    pub base: PathBuf,
    sources: Sources,
    findings: Vec<Finding>,
}

/// All settings files of a run, each read once.
#[derive(Debug, Default)]
pub struct Shelf {
    chosen: Option<Arc<Found>>,
    by_directory: BTreeMap<PathBuf, Option<Arc<Found>>>,
    in_order: Vec<Arc<Found>>,
}

impl Shelf {
    /// For the options of a run: the file that `--config` names holds for every netlist.
    ///
    /// # Errors
    /// Why that file cannot be read, or that a directory of `--include-dir` is not there.
    pub fn new(options: &CircuitOptions) -> Result<Self, String> {
        if let Some(gone) = options.include_dir.iter().find(|dir| !dir.is_dir()) {
            return Err(format!(
                "{}: there is no such directory to look for included files in",
                gone.display()
            ));
        }
        let chosen = options.config.as_deref();
        let mut shelf = Shelf::default();
        if let Some(path) = chosen {
            let found = read(path).map_err(|e| format!("{}: {}", path.display(), trouble::reading(&e)))?;
            shelf.chosen = Some(shelf.keep(found));
        }
        Ok(shelf)
    }

    /// The settings that hold for a file, or for what lies in a directory.
    pub fn of(&mut self, path: &Path) -> Option<Arc<Found>> {
        if self.chosen.is_some() {
            return self.chosen.clone();
        }
        let own = if path.is_dir() { Some(path) } else { path.parent() };
        let own = own.filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
        self.above(&own.canonicalize().ok()?)
    }

    fn above(&mut self, directory: &Path) -> Option<Arc<Found>> {
        if let Some(known) = self.by_directory.get(directory) {
            return known.clone();
        }
        let own = directory.join(SETTINGS_FILE);
        let found = if own.is_file() {
            Some(self.keep(read(&own).unwrap_or_else(|problem| unreadable(&own, &problem))))
        } else if directory.join(".git").exists() {
            // what lies above a repository does not belong to it
            None
        } else {
            directory.parent().and_then(|parent| self.above(parent))
        };
        self.by_directory.insert(directory.to_path_buf(), found.clone());
        found
    }

    fn keep(&mut self, found: Found) -> Arc<Found> {
        let found = Arc::new(found);
        self.in_order.push(found.clone());
        found
    }

    /// The mistakes in the files that were read.
    pub fn records(&self) -> Vec<Record> {
        let with_findings = self.in_order.iter().filter(|f| !f.findings.is_empty());
        with_findings.map(|f| Record::of_settings(f.sources.clone(), f.findings.clone())).collect()
    }

    /// All mistakes, for commands that only count them.
    pub fn findings(&self) -> impl Iterator<Item = &Finding> {
        self.in_order.iter().flat_map(|f| &f.findings)
    }
}

/// Settings that are there and cannot be read: whoever wrote them believes that they hold.
fn unreadable(path: &Path, problem: &std::io::Error) -> Found {
    let mut sources = Sources::default();
    let file = sources.add(path.display().to_string(), Vec::new());
    let message = format!("{SETTINGS_FILE} cannot be read: {}", trouble::reading(problem));
    let finding = Finding::new("unreadable-settings", Severity::Error, Span::new(file, 0, 0), message)
        .help("None of its settings hold. Mend its permissions, or name another with --config.");
    Found { settings: Settings::default(), base: PathBuf::new(), sources, findings: vec![finding] }
}

fn read(path: &Path) -> std::io::Result<Found> {
    let bytes = std::fs::read(path)?;
    let here = std::env::current_dir().and_then(|d| d.canonicalize()).unwrap_or_default();
    let mut sources = Sources::default();
    let file = sources.add(path.strip_prefix(&here).unwrap_or(path).display().to_string(), bytes);
    let names: Vec<&str> = rules::all().iter().map(|r| r.name).collect();
    let text = sources.get(file).map_or("", |f| f.text.as_str());
    let (settings, findings) = settings(text, FileId(0), &names);
    let base = path.parent().map(|p| p.strip_prefix(&here).unwrap_or(p).to_path_buf()).unwrap_or_default();
    Ok(Found { settings, base, sources, findings })
}
