//! Where things stand: file numbers, byte ranges, and their translation to lines and columns.

use super::decode::{Encoding, decode};
use std::sync::OnceLock;

/// Number of a file in [`Sources`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct FileId(pub u32);

/// A range of bytes of one decoded file: `start` inclusive, `end` exclusive, both on character boundaries.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Span {
    /// The file.
    pub file: FileId,
    /// First byte.
    pub start: u32,
    /// One past the last byte.
    pub end: u32,
}

impl Span {
    /// A span of `file` from byte `start` up to but not including `end`.
    pub fn new(file: FileId, start: usize, end: usize) -> Self {
        let clamp = |at: usize| u32::try_from(at).unwrap_or(u32::MAX);
        Span { file, start: clamp(start), end: clamp(end) }
    }

    /// The smallest span that covers both; `self` where the files differ.
    pub fn to(self, other: Span) -> Span {
        if self.file != other.file {
            return self;
        }
        Span { file: self.file, start: self.start.min(other.start), end: self.end.max(other.end) }
    }

    /// The byte range, for slicing.
    pub fn range(self) -> std::ops::Range<usize> {
        self.start as usize..self.end as usize
    }
}

/// A place as people count it: both from 1, the column in Unicode code points.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Position {
    /// Line, from 1.
    pub line: usize,
    /// Column in code points, from 1.
    pub column: usize,
}

/// One file that was read.
#[derive(Debug, Clone)]
pub struct SourceFile {
    /// The name to show: the path as the user or the including file wrote it, resolved.
    pub name: String,
    /// Decoded text. Spans count bytes of this string.
    pub text: String,
    /// How the bytes were encoded on disk.
    pub encoding: Encoding,
    /// Made when the first place is asked for: a file without findings needs none.
    line_starts: OnceLock<Vec<u32>>,
}

impl SourceFile {
    /// Byte offsets of the line starts; the first is 0.
    pub fn line_starts(&self) -> &[u32] {
        self.line_starts.get_or_init(|| {
            let behind = |at: usize| Span::new(FileId(0), at + 1, 0).start;
            std::iter::once(0).chain(memchr::memchr_iter(b'\n', self.text.as_bytes()).map(behind)).collect()
        })
    }

    /// The line (from 0) that holds byte `offset`.
    pub fn line_index(&self, offset: usize) -> usize {
        let offset = u32::try_from(offset).unwrap_or(u32::MAX);
        self.line_starts().partition_point(|&start| start <= offset).saturating_sub(1)
    }

    /// Line and column of byte `offset`; past the end it is the end.
    pub fn position(&self, offset: usize) -> Position {
        let mut offset = offset.min(self.text.len());
        while !self.text.is_char_boundary(offset) {
            offset -= 1;
        }
        let line = self.line_index(offset);
        let start = self.line_starts().get(line).map_or(0, |&s| s as usize);
        let column = self.text.get(start..offset).map_or(0, |t| t.chars().count());
        Position { line: line + 1, column: column + 1 }
    }
}

/// All files of one run, in the order they were read.
#[derive(Debug, Clone, Default)]
pub struct Sources {
    files: Vec<SourceFile>,
}

impl Sources {
    /// Decodes `bytes` and keeps them under `name`.
    pub fn add(&mut self, name: impl Into<String>, bytes: impl Into<Vec<u8>>) -> FileId {
        let (text, encoding) = decode(bytes.into());
        let id = FileId(u32::try_from(self.files.len()).unwrap_or(u32::MAX));
        self.files.push(SourceFile { name: name.into(), text, encoding, line_starts: OnceLock::new() });
        id
    }

    /// The file, if the number is one of ours.
    pub fn get(&self, id: FileId) -> Option<&SourceFile> {
        self.files.get(id.0 as usize)
    }

    /// Name of a file, `?` for a number that is not ours.
    pub fn name(&self, id: FileId) -> &str {
        self.get(id).map_or("?", |f| f.name.as_str())
    }

    /// The text under a span; empty where the span is not inside its file.
    pub fn slice(&self, span: Span) -> &str {
        self.get(span.file).and_then(|f| f.text.get(span.range())).unwrap_or("")
    }

    /// Start and end of a span as people count; the end column is one past the last character.
    pub fn positions(&self, span: Span) -> (Position, Position) {
        match self.get(span.file) {
            Some(file) => (file.position(span.start as usize), file.position(span.end as usize)),
            None => (Position { line: 1, column: 1 }, Position { line: 1, column: 1 }),
        }
    }

    /// All files in order.
    pub fn files(&self) -> impl Iterator<Item = (FileId, &SourceFile)> {
        self.files.iter().enumerate().map(|(n, f)| (FileId(n as u32), f))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_count_code_points_from_one() {
        let mut sources = Sources::default();
        let file = sources.add("a", "title\nR1 µ 0 1k\n".as_bytes());
        let text = &sources.get(file).unwrap().text;
        let at = text.find("0 1k").unwrap();
        let (start, end) = sources.positions(Span::new(file, at, at + 1));
        assert_eq!((start.line, start.column), (2, 6));
        assert_eq!((end.line, end.column), (2, 7));
    }

    #[test]
    fn positions_past_the_end_are_the_end() {
        let mut sources = Sources::default();
        let file = sources.add("a", b"t\n");
        let (start, _) = sources.positions(Span::new(file, 99, 100));
        assert_eq!((start.line, start.column), (2, 1));
    }
}
