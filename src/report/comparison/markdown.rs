//! The comparison as Markdown, for a comment in a review.

use super::super::markdown::{code, escaped, prose};
use super::super::summary::counted;
use super::rows::{conditions, flips, moves, trust, verdicts, wiring, worst_first};
use super::{Compared, Fate, MOST, SHARED};
use crate::finding::quantity;
use crate::review::{Comparison, Record};
use std::fmt::Write as _;

/// What differs in all files.
pub fn markdown(files: &[Compared], share: f64) -> String {
    let mut out = String::from("### kneewise: what this change does\n");
    for compared in files.iter().filter(|c| c.differs() || c.shares_parts) {
        let file = code(&compared.file);
        match &compared.fate {
            Fate::Both(comparison) => {
                let _ = write!(out, "\n#### {file}\n");
                both(&mut out, comparison, share);
                if compared.shares_parts {
                    let _ = write!(out, "\n{}\n", prose(SHARED));
                }
            }
            Fate::New(record) => {
                let scope = [counted(record.elements, "element"), counted(record.diodes, "diode")];
                let _ = write!(out, "\n#### {file} is new: {}\n", scope.join(", "));
                findings(&mut out, "Findings", record);
            }
            Fate::Gone => {
                let _ = write!(out, "\n#### {file} is gone\n");
            }
        }
    }
    if !files.iter().any(Compared::differs) {
        out.push_str("\nElectrically nothing differs.\n");
    }
    out
}

fn both(out: &mut String, comparison: &Comparison, share: f64) {
    let flips = flips(comparison);
    if !flips.is_empty() {
        out.push_str(
            "\n**States that flip**\n\n| diode | before | now | in | why |\n|---|---|---|---|---|\n",
        );
        for flip in flips.iter().take(MOST) {
            let cases = escaped(&conditions(&flip.cases));
            let why = escaped(flip.why);
            let _ =
                writeln!(out, "| {} | {} | {} | {cases} | {why} |", code(&flip.names()), flip.old, flip.new);
        }
        more(out, flips.len());
    }
    let moves = moves(comparison);
    if !moves.is_empty() {
        let _ = write!(
            out,
            "\n**Currents and voltages that move by more than {} %**\n\n| of | what | before | now | change | in |\n|---|---|--:|--:|---|---|\n",
            100.0 * share
        );
        for row in moves.iter().take(MOST) {
            let (old, new) = (quantity(row.old, row.unit), quantity(row.new, row.unit));
            let cases = escaped(&conditions(&row.cases));
            let name = code(row.name);
            let _ = writeln!(out, "| {name} | {} | {old} | {new} | {} | {cases} |", row.what, row.change());
        }
        more(out, moves.len());
    }
    let rows: Vec<String> = verdicts(comparison).into_iter().chain(trust(comparison)).collect();
    list(out, "Verdicts and trust", &rows);
    findings(out, "Findings that are new", &comparison.findings.new);
    findings(out, "Findings that are gone", &comparison.findings.gone);
    list(out, "Wiring", &wiring(comparison));
}

fn findings(out: &mut String, title: &str, record: &Record) {
    let rows: Vec<String> = worst_first(record)
        .into_iter()
        .map(|f| {
            let line = record.sources.positions(f.span).0.line;
            let place = format!("{}:{line}", record.sources.name(f.span.file));
            format!("{} {} {}: {}", f.severity.word(), code(f.rule), code(&place), prose(&f.message))
        })
        .collect();
    raw_list(out, title, &rows);
}

fn list(out: &mut String, title: &str, rows: &[String]) {
    let rows: Vec<String> = rows.iter().map(|row| escaped(row)).collect();
    raw_list(out, title, &rows);
}

fn raw_list(out: &mut String, title: &str, rows: &[String]) {
    if rows.is_empty() {
        return;
    }
    let _ = write!(out, "\n**{title}**\n\n");
    for row in rows.iter().take(MOST) {
        let _ = writeln!(out, "- {row}");
    }
    more(out, rows.len());
}

fn more(out: &mut String, all: usize) {
    if all > MOST {
        let _ = write!(out, "\nand {} more\n", all - MOST);
    }
}
