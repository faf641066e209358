//! The comparison on a terminal.

use super::super::paint::{Ink, Page, clean, wrap};
use super::super::summary::counted;
use super::super::table::{self, Cell};
use super::super::terminal::ink;
use super::rows::{conditions, flips, moves, trust, verdicts, wiring, worst_first};
use super::{Compared, Fate, MOST, SHARED};
use crate::finding::{Finding, figure};
use crate::review::{Comparison, Record};

/// Running text is broken at this width.
const WIDTH: usize = 96;

/// Writes what differs in all files, and a closing line. `share` is what a quantity must move by to be told.
pub fn comparison(page: &mut Page, files: &[Compared], share: f64) {
    for compared in files.iter().filter(|c| c.differs() || c.shares_parts) {
        page.ink(Ink::Strong, &clean(&compared.file));
        match &compared.fate {
            Fate::Both(comparison) => {
                page.end();
                both(page, comparison, share);
                if compared.shares_parts {
                    for line in wrap(SHARED, page.room(WIDTH) - 2) {
                        page.plain("  ").ink(Ink::Faint, &line).end();
                    }
                }
            }
            Fate::New(record) => {
                page.plain(" is new: ").plain(&counted(record.elements, "element")).plain(", ");
                page.plain(&counted(record.diodes, "diode")).end();
                list_findings(page, "finding", record);
            }
            Fate::Gone => {
                page.plain(" is gone").end();
            }
        }
        page.end();
    }
    let differing = files.iter().filter(|c| c.differs()).count();
    match (files.len(), differing) {
        (_, 0) => page.plain("electrically nothing differs").end(),
        (1, _) => page,
        (all, some) => {
            page.plain(&format!("{} compared, {some} with differences", counted(all, "file"))).end()
        }
    };
}

fn both(page: &mut Page, comparison: &Comparison, share: f64) {
    states(page, comparison);
    values(page, comparison, share);
    let rows: Vec<String> = verdicts(comparison).into_iter().chain(trust(comparison)).collect();
    section(page, "verdicts and trust", &rows);
    list_findings(page, "new", &comparison.findings.new);
    list_findings(page, "gone", &comparison.findings.gone);
    section(page, "wiring", &wiring(comparison));
}

fn states(page: &mut Page, comparison: &Comparison) {
    let flips = flips(comparison);
    if flips.is_empty() {
        return;
    }
    page.ink(Ink::Warning, "  states that flip").end();
    for flip in flips.iter().take(MOST) {
        page.plain("    ").ink(Ink::Strong, &clean(&flip.names()));
        page.plain(&clean(&format!(" {} → {}  ", flip.old, flip.new)));
        page.ink(Ink::Faint, &clean(&conditions(&flip.cases))).end();
        for line in wrap(flip.why, page.room(WIDTH) - 6) {
            page.plain("      ").plain(&line).end();
        }
    }
    more(page, flips.len());
}

fn values(page: &mut Page, comparison: &Comparison, share: f64) {
    let moves = moves(comparison);
    if moves.is_empty() {
        return;
    }
    let title = format!("  currents and voltages that move by more than {} %", 100.0 * share);
    page.ink(Ink::Second, &title).end();
    let rows: Vec<Vec<Cell>> = moves
        .iter()
        .take(MOST)
        .map(|row| {
            vec![
                Cell::word(clean(row.name)),
                Cell::word(row.what),
                figure(row.old, row.unit).into(),
                figure(row.new, row.unit).into(),
                Cell::word(row.change()),
                Cell::inked(clean(&conditions(&row.cases)), Some(Ink::Faint)),
            ]
        })
        .collect();
    table::write(page, "    ", &["of", "what", "before", "now", "change", "in"], &rows);
    more(page, moves.len());
}

fn list_findings(page: &mut Page, what: &str, record: &Record) {
    if record.findings.is_empty() {
        return;
    }
    let heading = if what == "finding" { "findings".to_owned() } else { format!("findings that are {what}") };
    page.ink(Ink::Second, &format!("  {heading}")).end();
    for finding in worst_first(record).into_iter().take(MOST) {
        page.plain("    ").ink(ink(finding.severity), finding.severity.word());
        page.plain(&format!(" · {} · {}", finding.rule, clean(&place(record, finding)))).end();
        for line in wrap(&finding.message, page.room(WIDTH) - 6) {
            page.plain("      ").plain(&line).end();
        }
    }
    more(page, record.findings.len());
}

fn place(record: &Record, finding: &Finding) -> String {
    let line = record.sources.positions(finding.span).0.line;
    format!("{}:{line}", record.sources.name(finding.span.file))
}

fn section(page: &mut Page, title: &str, rows: &[String]) {
    if rows.is_empty() {
        return;
    }
    page.ink(Ink::Second, &format!("  {title}")).end();
    for row in rows.iter().take(MOST) {
        for (n, line) in wrap(row, page.room(WIDTH) - 6).iter().enumerate() {
            page.plain(if n == 0 { "    " } else { "      " }).plain(line).end();
        }
    }
    more(page, rows.len());
}

fn more(page: &mut Page, all: usize) {
    if all > MOST {
        page.ink(Ink::Faint, &format!("    and {} more", all - MOST)).end();
    }
}
