//! Findings as Markdown (CommonMark with tables), for a comment in a review: the counts first, then a line for each
//! error and warning, notes folded away. Text of the input never becomes markup.

use super::Summary;
use super::summary::counted;
use crate::finding::{Finding, Severity};
use crate::review::Record;
use crate::text::Sources;
use std::fmt::Write as _;

/// Findings listed one by one; a comment must stay readable.
const MOST: usize = 50;

/// The findings of a run.
pub fn findings(records: &[Record], summary: Summary) -> String {
    let mut out = String::from("### kneewise\n\n");
    let scope = [
        counted(summary.files, "file"),
        counted(summary.elements, "element"),
        counted(summary.diodes, "diode"),
    ];
    let _ = writeln!(out, "{}: {}", scope.join(", "), results(&summary));
    let of = |wanted: fn(&Finding) -> bool| -> Vec<(&Sources, &Finding)> {
        let all = records.iter().flat_map(|r| r.findings.iter().map(|f| (&r.sources, f)));
        all.filter(|(_, f)| f.accepted.is_none() && wanted(f)).collect()
    };
    let mut troubles = of(|f| f.severity > Severity::Note);
    troubles.sort_by_key(|(_, f)| std::cmp::Reverse(f.severity));
    if !troubles.is_empty() {
        out.push('\n');
        table(&mut out, &troubles);
    }
    let notes = of(|f| f.severity == Severity::Note);
    if !notes.is_empty() {
        let _ = write!(out, "\n<details><summary>{}</summary>\n\n", counted(notes.len(), "note"));
        table(&mut out, &notes);
        out.push_str("\n</details>\n");
    }
    out
}

/// `**1 error**, 2 warnings, no notes (3 accepted)`
fn results(summary: &Summary) -> String {
    let bold = |count: usize, noun: &str| match count {
        0 => counted(0, noun),
        n => format!("**{}**", counted(n, noun)),
    };
    let mut text = format!(
        "{}, {}, {}",
        bold(summary.errors, "error"),
        bold(summary.warnings, "warning"),
        counted(summary.notes, "note")
    );
    let aside: Vec<String> = [(summary.accepted, "accepted"), (summary.known, "known before")]
        .iter()
        .filter(|(count, _)| *count > 0)
        .map(|(count, what)| format!("{count} {what}"))
        .collect();
    if !aside.is_empty() {
        let _ = write!(text, " ({})", aside.join(", "));
    }
    text
}

fn table(out: &mut String, findings: &[(&Sources, &Finding)]) {
    out.push_str("| | where | what |\n|---|---|---|\n");
    for (sources, finding) in findings.iter().take(MOST) {
        let line = sources.positions(finding.span).0.line;
        let place = format!("{}:{line}", sources.name(finding.span.file));
        let edit = finding.fix.as_ref().map(|fix| format!(" — {}", fix.title)).unwrap_or_default();
        let _ = writeln!(
            out,
            "| {} | {} | {} ({}){} |",
            finding.severity.word(),
            code(&place),
            prose(&finding.message),
            code(finding.rule),
            prose(&edit),
        );
    }
    if findings.len() > MOST {
        let _ = writeln!(out, "\nand {} more", findings.len() - MOST);
    }
}

/// Text in which nothing is markup: punctuation escaped (CommonMark 2.4), line ends gone.
pub(super) fn escaped(text: &str) -> String {
    let mut out = String::new();
    for c in text.chars() {
        match c {
            '\\' | '`' | '*' | '_' | '{' | '}' | '[' | ']' | '<' | '>' | '#' | '|' | '!' | '~' | '&'
            | '$' | '@' => {
                out.push('\\');
                out.push(c);
            }
            c if c.is_control() => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

/// A sentence of ours, in which names stand between backquotes: those become code, the rest is no markup.
pub(super) fn prose(text: &str) -> String {
    let parts: Vec<&str> = text.split('`').collect();
    if parts.len().is_multiple_of(2) {
        // a backquote of the input's own: nothing is sure
        return escaped(text);
    }
    let part = |(n, part): (usize, &&str)| match n % 2 {
        1 if !part.is_empty() => code(part),
        1 => escaped("``"),
        _ => escaped(part),
    };
    parts.iter().enumerate().map(part).collect()
}

/// Text as code: the fence is longer than any run of backquotes inside (CommonMark 6.1).
pub(super) fn code(text: &str) -> String {
    let clean: String = text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect();
    // a table is cut at its bars before code is seen
    let clean = clean.replace('|', "\\|");
    let longest = clean.split(|c| c != '`').map(str::len).max().unwrap_or(0);
    let fence = "`".repeat(longest + 1);
    let pad = if clean.starts_with('`') || clean.ends_with('`') { " " } else { "" };
    format!("{fence}{pad}{clean}{pad}{fence}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_of_the_input_is_no_markup() {
        assert_eq!(escaped("node <b>|x*"), "node \\<b\\>\\|x\\*");
        assert_eq!(escaped("two\nlines"), "two lines");
        assert_eq!(prose("node `a_b` and <b>"), "node `a_b` and \\<b\\>");
        assert_eq!(prose("one ` alone"), "one \\` alone");
        assert_eq!(code("a|b"), "`a\\|b`");
        assert_eq!(code("a`b"), "``a`b``");
        assert_eq!(code("`"), "`` ` ``");
    }
}
