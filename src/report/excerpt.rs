//! The lines of the input that one finding shows, made fit for a terminal: control characters replaced, very
//! long lines cut around their mark, marks kept on one line. This is what codespan-reporting gets as "files".

use super::paint::fit;
use crate::text::{FileId, SourceFile, Sources, Span};
use codespan_reporting::files::{Error, Files};
use std::collections::BTreeMap;
use std::ops::Range;

/// Lines longer than this are cut, in characters.
const LONGEST: usize = 160;
/// Characters kept before and after the start of the first mark of a line that is cut.
const BEFORE: usize = 40;
const AFTER: usize = 100;

/// One line as shown.
#[derive(Debug)]
struct Shown {
    /// Where it stands in the text of its sheet.
    range: Range<usize>,
    /// Byte in the line of the file → byte in the line as shown, one for each character and the end.
    map: Vec<(usize, usize)>,
}

impl Shown {
    /// Translates a byte of the line; what was cut off lands on the nearer end.
    fn at(&self, byte: usize) -> usize {
        let next = self.map.partition_point(|&(real, _)| real < byte);
        let found = self.map.get(next).or(self.map.last());
        found.map_or(self.range.start, |&(_, shown)| self.range.start + shown)
    }
}

/// The lines of one file.
#[derive(Debug, Default)]
struct Sheet {
    text: String,
    lines: BTreeMap<usize, Shown>,
}

/// The lines of one finding.
pub(super) struct Excerpt<'a> {
    sources: &'a Sources,
    sheets: BTreeMap<FileId, Sheet>,
}

impl<'a> Excerpt<'a> {
    /// Collects the lines under `spans`, the main one first.
    pub fn new(sources: &'a Sources, spans: impl Iterator<Item = Span>) -> Self {
        let mut wanted: BTreeMap<FileId, BTreeMap<usize, usize>> = BTreeMap::new();
        for span in spans {
            let Some(file) = sources.get(span.file) else { continue };
            let line = file.line_index(span.start as usize);
            let lines = wanted.entry(span.file).or_default();
            lines.entry(line).or_insert(span.start as usize);
            // a single line between two marked ones is shown too
            lines.entry(line + 1).or_insert(usize::MAX);
        }
        let sheet = |(id, lines): (FileId, BTreeMap<usize, usize>)| {
            sources.get(id).map(|file| (id, Sheet::new(file, lines)))
        };
        Excerpt { sources, sheets: wanted.into_iter().filter_map(sheet).collect() }
    }

    /// The line where a span starts: in its file, and as shown.
    fn line(&self, span: Span) -> Option<(Range<usize>, &Shown, &Sheet)> {
        let file = self.sources.get(span.file)?;
        let line = file.line_index(span.start as usize);
        let sheet = self.sheets.get(&span.file)?;
        Some((line_range(file, line)?, sheet.lines.get(&line)?, sheet))
    }

    /// The span as a range of the sheet, clipped to its first line; `None` for a file that is not there.
    pub fn range(&self, span: Span) -> Option<Range<usize>> {
        let (content, shown, _) = self.line(span)?;
        let clip = |byte: u32| (byte as usize).clamp(content.start, content.end) - content.start;
        Some(shown.at(clip(span.start))..shown.at(clip(span.end)))
    }

    /// Whether nothing stands on the line where the span starts.
    pub fn is_blank(&self, span: Span) -> bool {
        let text = self.line(span).and_then(|(_, shown, sheet)| sheet.text.get(shown.range.clone()));
        text.is_none_or(|t| t.trim().is_empty())
    }
}

/// Bytes of a line without its line break.
fn line_range(file: &SourceFile, line: usize) -> Option<Range<usize>> {
    let start = *file.line_starts().get(line)? as usize;
    let end = file.line_starts().get(line + 1).map_or(file.text.len(), |&e| e as usize);
    let content = file.text.get(start..end)?.trim_end_matches(['\n', '\r']);
    Some(start..start + content.len())
}

impl Sheet {
    /// `lines` maps the line to the byte of the file that must stay visible.
    fn new(file: &SourceFile, lines: BTreeMap<usize, usize>) -> Self {
        let mut sheet = Sheet::default();
        for (line, focus) in lines {
            if let Some(range) = line_range(file, line) {
                let focus = focus.saturating_sub(range.start);
                sheet.push(line, file.text.get(range).unwrap_or(""), focus);
            }
        }
        sheet
    }

    fn push(&mut self, line: usize, content: &str, focus: usize) {
        let window = window(content, focus);
        let start = self.text.len();
        if window.start > 0 {
            self.text.push('…');
        }
        let mut map = Vec::new();
        for (at, c) in content.get(window.clone()).unwrap_or("").char_indices() {
            map.push((window.start + at, self.text.len() - start));
            self.text.push(fit(c));
        }
        map.push((window.end, self.text.len() - start));
        if window.end < content.len() {
            self.text.push('…');
        }
        let range = start..self.text.len();
        self.text.push('\n');
        self.lines.insert(line, Shown { range, map });
    }
}

/// The bytes of a line to show: all of it, or a stretch around `focus`.
fn window(content: &str, focus: usize) -> Range<usize> {
    if content.chars().nth(LONGEST).is_none() {
        return 0..content.len();
    }
    // a line that is shown only for its neighbours starts at its start
    let focus = if focus >= content.len() { 0 } else { content.floor_char_boundary(focus) };
    let (left, right) = content.split_at(focus);
    let start = left.char_indices().rev().nth(BEFORE - 1).map_or(0, |(at, _)| at);
    let end = right.char_indices().nth(AFTER).map_or(content.len(), |(at, _)| focus + at);
    start..end
}

impl<'a> Files<'a> for Excerpt<'_> {
    type FileId = FileId;
    type Name = String;
    type Source = &'a str;

    fn name(&'a self, id: FileId) -> Result<String, Error> {
        Ok(super::paint::whole(self.sources.name(id)))
    }

    fn source(&'a self, id: FileId) -> Result<&'a str, Error> {
        self.sheets.get(&id).map(|s| s.text.as_str()).ok_or(Error::FileMissing)
    }

    fn line_index(&'a self, id: FileId, byte: usize) -> Result<usize, Error> {
        let sheet = self.sheets.get(&id).ok_or(Error::FileMissing)?;
        let before = sheet.lines.iter().take_while(|(_, shown)| shown.range.start <= byte);
        Ok(before.last().map_or(0, |(&line, _)| line))
    }

    fn line_number(&'a self, _: FileId, line: usize) -> Result<usize, Error> {
        Ok(line + 1)
    }

    fn column_number(&'a self, id: FileId, line: usize, byte: usize) -> Result<usize, Error> {
        let shown = self.sheets.get(&id).and_then(|s| s.lines.get(&line)).ok_or(Error::FileMissing)?;
        let local = byte.saturating_sub(shown.range.start);
        let real = shown.map.iter().find(|&&(_, at)| at >= local).map_or(0, |&(real, _)| real);
        let file = self.sources.get(id).ok_or(Error::FileMissing)?;
        let start = file.line_starts().get(line).map_or(0, |&s| s as usize);
        Ok(file.position(start + real).column)
    }

    fn line_range(&'a self, id: FileId, line: usize) -> Result<Range<usize>, Error> {
        let lines = self.sheets.get(&id).map(|s| &s.lines).ok_or(Error::FileMissing)?;
        let max = lines.last_key_value().map_or(0, |(&l, _)| l);
        lines.get(&line).map(|s| s.range.clone()).ok_or(Error::LineTooLarge { given: line, max })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn excerpt_of(text: &str, start: usize, end: usize) -> (String, Range<usize>) {
        let mut sources = Sources::default();
        let file = sources.add("a", text.as_bytes());
        let span = Span::new(file, start, end);
        let excerpt = Excerpt::new(&sources, std::iter::once(span));
        let range = excerpt.range(span).unwrap();
        (excerpt.sheets[&file].text.clone(), range)
    }

    #[test]
    fn marks_stop_before_the_line_break() {
        let (text, range) = excerpt_of("t\r\nR1 a b 1k\r\nR2", 3, 14);
        assert_eq!(&text[range], "R1 a b 1k");
    }

    #[test]
    fn a_mark_over_many_lines_keeps_to_the_first() {
        let (text, range) = excerpt_of("t\n.model D D(\n+ is=1)\n", 2, 20);
        assert_eq!(&text[range], ".model D D(");
    }

    #[test]
    fn long_lines_are_cut_around_the_mark() {
        let text = format!("t\n{}MARK{}\n", "é".repeat(50_000), "y".repeat(50_000));
        let at = text.find("MARK").unwrap();
        let (shown, range) = excerpt_of(&text, at, at + 4);
        assert_eq!(&shown[range], "MARK");
        assert!(shown.chars().count() < 250, "{}", shown.chars().count());
    }

    #[test]
    fn control_characters_are_replaced_and_marks_stay_in_place() {
        let (shown, range) = excerpt_of("t\nR1 \x1b[31m a MARK\n", 13, 17);
        assert_eq!(&shown[range], "MARK");
        assert!(!shown.contains('\x1b'));
    }
}
