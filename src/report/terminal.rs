//! Findings for a person. One finding reads: severity, rule and place; the sentence; the marked lines; why it
//! matters and what to do; the edit that mends it; the way that leads there.

use super::excerpt::Excerpt;
use super::paint::{Ink, Page, clean, whole, wrap};
use super::pen::{INDENT, Pen};
use crate::finding::{Edit, Finding, Severity};
use crate::rules::Skipped;
use crate::text::{FileId, Sources};
use codespan_reporting::diagnostic::{self, Diagnostic, Label};
use codespan_reporting::term::{self, Chars, Config};

/// Running text is broken at this width.
const WIDTH: usize = 100;

/// Writes findings in the order given; accepted ones are left to the summary.
pub fn findings(page: &mut Page, sources: &Sources, findings: &[Finding]) {
    for finding in findings.iter().filter(|f| f.accepted.is_none()) {
        headline(page, sources, finding);
        for line in wrap(&finding.message, page.room(WIDTH)) {
            page.plain(INDENT).ink(Ink::Strong, &line).end();
        }
        snippet(page, sources, finding);
        paragraph(page, "", &finding.help);
        fix(page, sources, finding);
        trail(page, sources, finding);
        page.end();
    }
}

/// Writes accepted findings, a line or two each, with the reasons given for them.
pub fn accepted(page: &mut Page, sources: &Sources, findings: &[Finding]) {
    for finding in findings {
        let Some(reason) = &finding.accepted else { continue };
        let (start, _) = sources.positions(finding.span);
        let name = whole(sources.name(finding.span.file));
        page.ink(Ink::Faint, "accepted").plain(" · ").plain(finding.rule).plain(" · ");
        page.plain(&format!("{name}:{}:{}", start.line, start.column)).end();
        for line in wrap(&finding.message, page.room(WIDTH)) {
            page.plain(INDENT).plain(&line).end();
        }
        paragraph(page, "because ", reason);
        page.end();
    }
}

/// Writes which rules could not judge, and why.
pub fn skipped(page: &mut Page, skipped: &[Skipped]) {
    for skip in skipped {
        let text = format!("not judged: {}, because {}", skip.rule, clean(&skip.reason));
        for line in wrap(&text, page.room(WIDTH)) {
            page.ink(Ink::Faint, &line).end();
        }
    }
}

/// The ink of a severity.
pub(super) fn ink(severity: Severity) -> Ink {
    match severity {
        Severity::Error => Ink::Error,
        Severity::Warning => Ink::Warning,
        Severity::Note => Ink::Note,
    }
}

/// `warning · never-conducts · supply.net:14:1`
fn headline(page: &mut Page, sources: &Sources, finding: &Finding) {
    let (start, _) = sources.positions(finding.span);
    let name = whole(sources.name(finding.span.file));
    page.ink(ink(finding.severity), finding.severity.word());
    page.plain(" · ").plain(finding.rule).plain(" · ");
    page.plain(&format!("{name}:{}:{}", start.line, start.column)).end();
}

/// A paragraph under the finding, its first line behind `lead`.
fn paragraph(page: &mut Page, lead: &str, text: &str) {
    if text.is_empty() {
        return;
    }
    let hang = " ".repeat(lead.chars().count());
    for (n, line) in wrap(text, page.room(WIDTH) - hang.len()).iter().enumerate() {
        page.plain(INDENT);
        match n {
            0 => page.ink(Ink::Second, lead),
            _ => page.plain(&hang),
        };
        page.plain(line).end();
    }
}

fn fix(page: &mut Page, sources: &Sources, finding: &Finding) {
    let Some(fix) = &finding.fix else { return };
    let edits: Vec<String> = fix.edits.iter().map(|edit| edit_words(sources, edit)).collect();
    paragraph(page, "edit: ", &format!("{} ({})", fix.title, edits.join("; ")));
}

/// `line 12: write 1Meg instead of 1M`
fn edit_words(sources: &Sources, edit: &Edit) -> String {
    let line = sources.positions(edit.span).0.line;
    let old = sources.slice(edit.span);
    match (old.is_empty(), edit.replacement.is_empty()) {
        (true, _) => format!("line {line}: insert `{}`", edit.replacement),
        (_, true) => format!("line {line}: remove `{old}`"),
        _ => format!("line {line}: `{old}` becomes `{}`", edit.replacement),
    }
}

fn trail(page: &mut Page, sources: &Sources, finding: &Finding) {
    for (n, step) in finding.trail.iter().enumerate() {
        let (start, _) = sources.positions(step.span);
        let place = format!("{}, {}:{}", step.what, sources.name(step.span.file), start.line);
        paragraph(page, if n == 0 { "by way of: " } else { "      then: " }, &place);
    }
}

/// The marked lines.
fn snippet(page: &mut Page, sources: &Sources, finding: &Finding) {
    let spans = std::iter::once(finding.span).chain(finding.labels.iter().map(|l| l.span));
    let excerpt = Excerpt::new(sources, spans);
    if excerpt.is_blank(finding.span) {
        return;
    }
    let Some(main) = excerpt.range(finding.span) else { return };
    let mut labels = vec![Label::primary(finding.span.file, main).with_message(clean(&finding.label))];
    for label in &finding.labels {
        if let Some(range) = excerpt.range(label.span) {
            labels.push(Label::secondary(label.span.file, range).with_message(clean(&label.message)));
        }
    }
    let severity = match finding.severity {
        Severity::Error => diagnostic::Severity::Error,
        Severity::Warning => diagnostic::Severity::Warning,
        Severity::Note => diagnostic::Severity::Note,
    };
    let diagnostic: Diagnostic<FileId> = Diagnostic::new(severity).with_labels(labels);
    let mut pen = Pen::new(page);
    // writing to memory cannot fail, and a file that is missing has no label
    let _ = term::emit_to_write_style(&mut pen, &config(), &excerpt, &diagnostic);
}

fn config() -> Config {
    let chars = Chars {
        snippet_start: "in".into(),
        source_border_left: '┊',
        source_border_left_break: '⋮',
        single_primary_caret: '▔',
        single_secondary_caret: '┈',
        pointer_left: '╵',
        ..Chars::box_drawing()
    };
    Config { chars, ..Config::default() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::finding::TrailStep;
    use crate::text::Span;

    fn page(colour: bool) -> String {
        let text = "Title\nV1 vin 0 12\nD1 0 vin DX\nR1 vin out 1M\n";
        let mut sources = Sources::default();
        let file = sources.add("board.net", text.as_bytes());
        let at = |what: &str| {
            let start = text.find(what).unwrap();
            Span::new(file, start, start + what.len())
        };
        let first = Finding::new("never-conducts", Severity::Warning, at("D1"), "D1 can never conduct")
            .label("its cathode is at +12 V")
            .also(at("V1 vin 0 12"), "this holds it there")
            .help("Turn it round if it is meant to carry current.");
        let mut second = Finding::new("misread-value", Severity::Warning, at("1M"), "R1 is 1 mΩ, not 1 MΩ");
        second =
            second.fix("write the mega as Meg", vec![Edit { span: at("1M"), replacement: "1Meg".into() }]);
        second.trail.push(TrailStep { span: at("V1 vin 0 12"), what: "instance X1 of DIVIDER".into() });
        let mut page = Page::new(colour);
        findings(&mut page, &sources, &[first, second]);
        page.text().to_owned()
    }

    #[test]
    fn a_finding_shows_all_its_parts() {
        let expected = "\
warning · never-conducts · board.net:3:1
  D1 can never conduct
  2 ┊ V1 vin 0 12
    ┊ ┈┈┈┈┈┈┈┈┈┈┈ this holds it there
  3 ┊ D1 0 vin DX
    ┊ ▔▔ its cathode is at +12 V
  Turn it round if it is meant to carry current.

warning · misread-value · board.net:4:12
  R1 is 1 mΩ, not 1 MΩ
  4 ┊ R1 vin out 1M
    ┊            ▔▔
  edit: write the mega as Meg (line 4: `1M` becomes `1Meg`)
  by way of: instance X1 of DIVIDER, board.net:2

";
        assert_eq!(page(false), expected);
    }

    #[test]
    fn colour_adds_nothing_but_colour() {
        let coloured = page(true);
        assert!(coloured.contains("\x1b[1;33mwarning\x1b[0m"));
        let mut plain = String::new();
        let mut rest = coloured.as_str();
        while let Some((before, after)) = rest.split_once("\x1b[") {
            plain.push_str(before);
            rest = after.split_once('m').unwrap().1;
        }
        plain.push_str(rest);
        assert_eq!(plain, page(false));
    }
}
