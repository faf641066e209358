//! The demo netlists: each says in comments which findings it must give. A line
//! `* expect-finding: RULE SUBJECT` stands for exactly one finding of warning or error severity, and
//! `* expect-note: RULE SUBJECT` for one note; SUBJECT is the first name that the finding is about, and may be
//! left out. Findings that are missing and findings that are too many both fail.

use crate::runner::{root, run};
use serde_json::Value;
use std::fmt::Write as _;

/// `warning-or-error RULE SUBJECT`, as written and as found.
fn expected(text: &str) -> Vec<String> {
    let mut lines: Vec<String> = text
        .lines()
        .filter_map(|line| {
            let (kind, rest) = line.strip_prefix("* expect-")?.split_once(':')?;
            Some(format!("{kind} {}", rest.split_whitespace().collect::<Vec<_>>().join(" ")))
        })
        .collect();
    lines.sort();
    lines
}

fn found(name: &str) -> Vec<String> {
    let run = run(&["check", name, "--format", "json"]);
    let document: Value =
        serde_json::from_str(&run.out).unwrap_or_else(|e| panic!("{name}: {e} {}", run.err));
    let line = |finding: &Value| {
        let kind = if finding["severity"] == "note" { "note" } else { "finding" };
        let subject = finding["subjects"][0].as_str().unwrap_or("");
        format!("{kind} {} {subject}", finding["rule"].as_str().unwrap()).trim().to_owned()
    };
    let findings = document["findings"].as_array().unwrap();
    let mut lines: Vec<String> = findings.iter().filter(|f| f["accepted"].is_null()).map(line).collect();
    lines.sort();
    lines
}

/// What stands in `a` and not in `b`, one for one.
fn surplus(a: &[String], b: &[String]) -> Vec<String> {
    let mut rest = b.to_vec();
    let missing = |line: &&String| match rest.iter().position(|other| other == *line) {
        Some(at) => {
            rest.remove(at);
            false
        }
        None => true,
    };
    a.iter().filter(missing).cloned().collect()
}

#[test]
fn fixtures_give_exactly_the_findings_they_announce() {
    let mut names: Vec<_> =
        std::fs::read_dir(root().join("fixtures")).unwrap().map(|e| e.unwrap().path()).collect();
    names.retain(|path| path.extension().is_some_and(|e| e == "net"));
    names.sort();
    assert!(names.len() >= 10, "the demo has at least ten netlists");
    let mut report = String::new();
    for path in names {
        let name = path.strip_prefix(root()).unwrap().to_str().unwrap();
        let expected = expected(&std::fs::read_to_string(&path).unwrap());
        let found = found(name);
        for line in surplus(&expected, &found) {
            writeln!(report, "{name}: announced but not found: {line}").unwrap();
        }
        for line in surplus(&found, &expected) {
            writeln!(report, "{name}: found but not announced: {line}").unwrap();
        }
    }
    assert!(report.is_empty(), "\n{report}");
}

#[test]
fn the_comparison_sees_both_directions() {
    let lines = |text: &[&str]| text.iter().map(|&t| t.to_owned()).collect::<Vec<_>>();
    let (a, b) = (lines(&["x", "x", "y"]), lines(&["x", "z"]));
    assert_eq!(surplus(&a, &b), ["x", "y"]);
    assert_eq!(surplus(&b, &a), ["z"]);
}
