//! The findings of an older state, to tell new ones from those that were there before. Findings are the same where
//! rule, file and subjects are: lines may have moved.

use super::record::Record;
use crate::finding::Finding;
use crate::text::{FileId, Sources};
use serde::Deserialize;
use std::collections::BTreeMap;
use std::path::{Component, Path, PathBuf};

/// Rule, and what it is about: the subjects, or without any the message.
type Key = (String, String);

/// What was there before. Each finding is there a number of times.
#[derive(Debug, Clone, Default)]
pub struct Baseline {
    known: BTreeMap<Key, Vec<(PathBuf, usize)>>,
}

/// As much of a saved document as is needed.
#[derive(Deserialize)]
struct Saved {
    format: String,
    findings: Vec<SavedFinding>,
}

#[derive(Deserialize)]
struct SavedFinding {
    rule: String,
    file: String,
    message: String,
    subjects: Vec<String>,
    accepted: Option<String>,
}

impl Baseline {
    /// Adds the findings of a file; `label` is its path below what was compared. Accepted ones do not count: what is
    /// no longer accepted is news.
    pub fn add(&mut self, record: &Record, label: &Path) {
        for finding in record.findings.iter().filter(|f| f.accepted.is_none()) {
            let file = place(&record.sources, finding, label);
            self.put(key(finding.rule, &finding.subjects, &finding.message), file);
        }
    }

    /// The findings that `check --format json` has saved.
    ///
    /// # Errors
    /// What is wrong with the document, in words.
    pub fn from_json(text: &str) -> Result<Self, String> {
        let saved: Saved = serde_json::from_str(text).map_err(|e| e.to_string())?;
        if saved.format != "kneewise.findings" {
            return Err(format!("it is a `{}` document, not `kneewise.findings`", saved.format));
        }
        let mut baseline = Baseline::default();
        for finding in saved.findings.iter().filter(|f| f.accepted.is_none()) {
            let file = plain(Path::new(&finding.file));
            baseline.put(key(&finding.rule, &finding.subjects, &finding.message), file);
        }
        Ok(baseline)
    }

    fn put(&mut self, key: Key, file: PathBuf) {
        let places = self.known.entry(key).or_default();
        match places.iter_mut().find(|(known, _)| *known == file) {
            Some((_, count)) => *count += 1,
            None => places.push((file, 1)),
        }
    }

    /// Moves the findings of a file that were there before out of the way; each counts once.
    pub fn sift(&mut self, record: &mut Record, label: &Path) {
        let (mut new, mut known) = (Vec::new(), Vec::new());
        for finding in std::mem::take(&mut record.findings) {
            let is_known = finding.accepted.is_none() && self.take_one(&record.sources, &finding, label);
            if is_known { known.push(finding) } else { new.push(finding) }
        }
        record.findings = new;
        record.known = known;
    }

    /// Whether a finding was there before; it then counts once less.
    pub(super) fn take_one(&mut self, sources: &Sources, finding: &Finding, label: &Path) -> bool {
        let file = place(sources, finding, label);
        let key = key(finding.rule, &finding.subjects, &finding.message);
        let Some(places) = self.known.get_mut(&key) else { return false };
        let left = |(_, count): &&mut (PathBuf, usize)| *count > 0;
        let same = places.iter().position(|(known, count)| *count > 0 && *known == file);
        // saved documents may have been written from another directory
        let at = same.or_else(|| places.iter().position(|(known, count)| *count > 0 && is_end(known, &file)));
        match at.and_then(|at| places.get_mut(at)).filter(left) {
            Some((_, count)) => {
                *count -= 1;
                true
            }
            None => false,
        }
    }
}

fn key(rule: &str, subjects: &[String], message: &str) -> Key {
    let what = if subjects.is_empty() { message.to_owned() } else { subjects.join("\n").to_lowercase() };
    (rule.to_owned(), what)
}

/// The file of a finding: the label for the root, the file's own name for what it includes.
fn place(sources: &Sources, finding: &Finding, label: &Path) -> PathBuf {
    match finding.span.file {
        FileId(0) => plain(label),
        included => Path::new(sources.name(included)).file_name().map(PathBuf::from).unwrap_or_default(),
    }
}

/// Without `.`.
fn plain(path: &Path) -> PathBuf {
    path.components().filter(|c| *c != Component::CurDir).collect()
}

fn is_end(a: &Path, b: &Path) -> bool {
    let named = |p: &Path| p.file_name().is_some();
    named(a) && named(b) && (a.ends_with(b) || b.ends_with(a))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::finding::Severity;
    use crate::text::Span;

    fn record(findings: &[(&'static str, &str, usize)]) -> Record {
        let mut sources = Sources::default();
        let file = sources.add("boards/a.net", b"t\nR1 a b 1k\nR2 a b 1k\n");
        let one = |&(rule, subject, at): &(&'static str, &str, usize)| {
            Finding::new(rule, Severity::Warning, Span::new(file, at, at + 2), format!("{rule} of {subject}"))
                .about(subject)
        };
        Record { sources, findings: findings.iter().map(one).collect(), ..Record::default() }
    }

    fn sifted(baseline: &mut Baseline, mut new: Record, label: &str) -> (Vec<String>, usize) {
        baseline.sift(&mut new, Path::new(label));
        (new.findings.iter().map(|f| f.message.clone()).collect(), new.known.len())
    }

    #[test]
    fn lines_may_move_and_each_counts_once() {
        let mut baseline = Baseline::default();
        baseline.add(&record(&[("r", "R1", 2)]), Path::new("a.net"));
        let new = record(&[("r", "r1", 12), ("r", "R1", 2), ("r", "R2", 2), ("s", "R1", 2)]);
        let (left, known) = sifted(&mut baseline, new, "a.net");
        assert_eq!((left, known), (vec!["r of R1".into(), "r of R2".into(), "s of R1".into()], 1));
    }

    #[test]
    fn another_file_of_one_name_is_another_file() {
        let mut baseline = Baseline::default();
        baseline.add(&record(&[("r", "R1", 2)]), Path::new("x/a.net"));
        assert_eq!(sifted(&mut baseline.clone(), record(&[("r", "R1", 2)]), "y/a.net").1, 0);
        assert_eq!(sifted(&mut baseline, record(&[("r", "R1", 2)]), "x/a.net").1, 1);
    }

    #[test]
    fn saved_findings_are_read_and_other_documents_are_not() {
        let text = r#"{"format":"kneewise.findings","version":1,"findings":[{"rule":"r","severity":"warning",
            "file":"./boards/a.net","line":1,"message":"m","subjects":["R1"],"accepted":null},{"rule":"r",
            "file":"boards/a.net","message":"m","subjects":["R2"],"accepted":"it is so"}]}"#;
        let mut baseline = Baseline::from_json(text).unwrap();
        let new = record(&[("r", "R1", 2), ("r", "R2", 2)]);
        assert_eq!(sifted(&mut baseline, new, "/home/me/boards/a.net"), (vec!["r of R2".to_owned()], 1));
        assert!(Baseline::from_json(r#"{"format":"kneewise.states","findings":[]}"#).is_err());
        assert!(Baseline::from_json("not JSON").is_err());
    }
}
