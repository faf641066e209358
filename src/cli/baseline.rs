//! `--against OLD`: reads the older state, which is a file, a directory, or findings saved as JSON.

use super::input::{Input, Job};
use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::review::{Baseline, Record};
use kneewise::text::trouble;
use std::path::{Path, PathBuf};

/// The older state.
pub struct Old {
    baseline: Baseline,
    /// What paths are seen from: the path that was given to `check`. `None` for saved findings, which hold whole paths.
    root: Option<PathBuf>,
}

impl Old {
    /// # Errors
    /// What cannot be read, in words.
    pub fn read(old: &Path, paths: &[PathBuf], jobs: &[Job], options: &[Options]) -> Result<Self, String> {
        let is_saved = old.extension().is_some_and(|e| e.eq_ignore_ascii_case("json"));
        if is_saved {
            let text = std::fs::read_to_string(old)
                .map_err(|e| format!("{}: {}", old.display(), trouble::reading(&e)))?;
            let baseline = Baseline::from_json(&text).map_err(|e| format!("{}: {e}", old.display()))?;
            return Ok(Old { baseline, root: None });
        }
        let [root] = paths else {
            return Err(
                "--against a file or directory takes one PATH; save the findings as JSON for several".into(),
            );
        };
        let mut baseline = Baseline::default();
        if !old.exists() {
            return Err(format!("{}: there is no such file or directory", old.display()));
        }
        if old.is_file() && root.is_dir() {
            return Err(format!(
                "{}: it is a file, and {} is a directory; give --against the older directory, or saved findings as .json",
                old.display(),
                root.display()
            ));
        }
        for (job, options) in jobs.iter().zip(options) {
            let label = label(&job.path, root);
            let path = if old.is_dir() { beside(old, &label, &job.path) } else { old.to_path_buf() };
            // a file that is new has no older state
            if path.is_file() {
                let analysis = analyse(&mut Input::default(), &path, options)
                    .map_err(|problem| format!("{}: {}", path.display(), problem.0))?;
                baseline.add(&Record::of(analysis, false), &label);
            }
        }
        Ok(Old { baseline, root: Some(root.clone()) })
    }

    /// Moves what was there before out of the way.
    pub fn sift(&mut self, record: &mut Record, job: &Job) {
        let label = self.root.as_ref().map_or_else(|| job.path.clone(), |root| label(&job.path, root));
        self.baseline.sift(record, &label);
    }

    /// The same for a file of settings, which is known by name only.
    pub fn sift_settings(&mut self, record: &mut Record) {
        let name = record.sources.name(kneewise::text::FileId(0)).to_owned();
        self.baseline.sift(record, Path::new(&name));
    }
}

/// The path below what was given; empty for a file that was given itself.
fn label(path: &Path, root: &Path) -> PathBuf {
    path.strip_prefix(root).unwrap_or(path).to_path_buf()
}

/// Where the older state of a file lies in a directory.
fn beside(old: &Path, label: &Path, path: &Path) -> PathBuf {
    if !label.as_os_str().is_empty() {
        return old.join(label);
    }
    let whole = old.join(path);
    if whole.is_file() { whole } else { old.join(path.file_name().unwrap_or_default()) }
}
