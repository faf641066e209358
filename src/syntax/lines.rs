//! Physical lines to logical ones: title, comments, continuations. Only looks at how each line begins.

use super::blank::{is_blank, is_hard_space};

/// What a logical line is, by its first character.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LineKind {
    /// Begins with a letter or anything that is nothing else.
    Element,
    /// Begins with a dot.
    Dot,
    /// Begins with `*@`.
    Note,
    /// Begins with `+` where nothing can be continued.
    Stray,
}

/// One logical line: a statement with all its continuation lines, as a byte range of the text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Line {
    /// First byte, not a blank.
    pub start: u32,
    /// One past the last byte; line ends and blanks at the end are not part of it.
    pub end: u32,
    /// What it is.
    pub kind: LineKind,
}

/// A file cut into logical lines.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Lines {
    /// The title, where the file has one: its line without line end.
    pub title: Option<(u32, u32)>,
    /// The statements and notes in order; a note between a statement and its continuation follows that statement.
    pub lines: Vec<Line>,
    /// Bytes of the longest of them.
    pub longest: usize,
}

/// `netlist = [title] *( comment / statement / note )`: cuts a text into logical lines.
///
/// `with_title`: whether line 1 is a title (only in the root file). The text must be shorter than 4 GiB.
pub fn lines(text: &str, with_title: bool) -> Lines {
    let bytes = text.as_bytes();
    let mut out = Lines::default();
    let mut cutter = Cutter { open: None, commented: false };
    let mut start = 0;
    if with_title {
        let end = memchr::memchr(b'\n', bytes).unwrap_or(bytes.len());
        out.title = Some((0, trimmed_end(bytes, 0, end)));
        start = (end + 1).min(bytes.len());
    }
    let body = start;
    let rest = bytes.get(body..).unwrap_or_default();
    for end in memchr::memchr_iter(b'\n', rest).map(|n| n + body).chain([bytes.len()]) {
        cutter.physical_line(bytes, start, end, &mut out);
        start = end + 1;
    }
    out
}

struct Cutter {
    /// The statement that a `+` would continue.
    open: Option<usize>,
    /// A commented-out dot line came last: a `+` continues the comment.
    commented: bool,
}

impl Cutter {
    fn physical_line(&mut self, bytes: &[u8], start: usize, end: usize, out: &mut Lines) {
        let Some(line) = bytes.get(start..end) else { return };
        let Some(indent) = indent(line) else { return };
        let body = &line[indent..];
        let from = start + indent;
        let kind = match body {
            [b'+', ..] => return self.continuation(bytes, from, end, out),
            [b'*', b'@', ..] => LineKind::Note,
            [b'*', b'.', ..] => {
                self.commented = true;
                return;
            }
            [b'*' | b';' | b'$', ..] => return,
            [b'.', ..] => LineKind::Dot,
            _ => LineKind::Element,
        };
        if kind != LineKind::Note {
            self.open = Some(out.lines.len());
            self.commented = false;
        }
        push(bytes, from, end, kind, out);
    }

    fn continuation(&mut self, bytes: &[u8], from: usize, end: usize, out: &mut Lines) {
        if self.commented {
            return;
        }
        match self.open.and_then(|n| out.lines.get_mut(n)) {
            Some(line) => {
                line.end = trimmed_end(bytes, from, end);
                out.longest = out.longest.max((line.end - line.start) as usize);
            }
            None => push(bytes, from, end, LineKind::Stray, out),
        }
    }
}

/// Length of the blanks at the start of a line; `None` where there is nothing else.
fn indent(line: &[u8]) -> Option<usize> {
    let mut at = line.iter().position(|&b| !is_blank(b))?;
    while is_hard_space(line, at) {
        at += 2;
        at += line.get(at..)?.iter().position(|&b| !is_blank(b))?;
    }
    Some(at)
}

fn push(bytes: &[u8], from: usize, end: usize, kind: LineKind, out: &mut Lines) {
    let line = Line { start: offset(from), end: trimmed_end(bytes, from, end), kind };
    out.longest = out.longest.max((line.end - line.start) as usize);
    out.lines.push(line);
}

fn trimmed_end(bytes: &[u8], start: usize, mut end: usize) -> u32 {
    while end > start && bytes.get(end - 1).is_some_and(|&b| is_blank(b)) {
        end -= 1;
    }
    offset(end)
}

fn offset(at: usize) -> u32 {
    u32::try_from(at).unwrap_or(u32::MAX)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cut(text: &str) -> Vec<(&str, LineKind)> {
        lines(text, true).lines.iter().map(|l| (&text[l.start as usize..l.end as usize], l.kind)).collect()
    }

    #[test]
    fn first_line_is_the_title() {
        let text = "R1 a b 1k\r\nR2 a b 2k \r\n";
        assert_eq!(lines(text, true).title, Some((0, 9)));
        assert_eq!(cut(text), [("R2 a b 2k", LineKind::Element)]);
        assert_eq!(lines(text, false).lines.len(), 2);
        assert_eq!(cut("t\n \u{A0}\n\u{A0} * c\n\u{A0}R1"), [("R1", LineKind::Element)]);
    }

    #[test]
    fn plus_continues_over_comments_and_notes() {
        let text = "t\nR1 a\n* between\n\n*@ watch a\n+ b 1k\n.end";
        assert_eq!(
            cut(text),
            [
                ("R1 a\n* between\n\n*@ watch a\n+ b 1k", LineKind::Element),
                ("*@ watch a", LineKind::Note),
                (".end", LineKind::Dot)
            ]
        );
    }

    #[test]
    fn plus_under_a_commented_dot_line_continues_the_comment() {
        assert_eq!(cut("t\nR1 a b 1\n*.model D D (\n+ IS=1n)\nR2 a b 1").len(), 2);
        assert_eq!(cut("t\n+ R1 a b 1")[0].1, LineKind::Stray);
    }
}
