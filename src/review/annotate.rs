//! Puts marks behind the diodes of a file, and takes them away. Changes nothing else: the edits are made in the bytes
//! that were read, whatever their encoding, line ends and blanks. A file that several circuits include gets one mark a
//! diode, which speaks for all of them.

use super::figures::agree;
use super::mark::{Life, lives, words};
use super::wording::is_mark;
use crate::analysis::Analysis;
use crate::syntax::{Line, LineKind, Token, lines, tokens};
use crate::text::{Encoding, SourceFile, Sources, Span, decode, encode, original_offsets};
use std::collections::BTreeMap;
use std::ops::Range;

/// How a mark begins; white space follows, and words of its grammar.
const SIGN: &str = ";@";

/// One mark that is put, renewed or taken away.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Change {
    /// Line in the file, from 1.
    pub line: usize,
    /// The element's name as written.
    pub name: String,
    /// What the mark says so far, without its `;@`.
    pub old: Option<String>,
    /// What it is to say; `None` where it goes.
    pub new: Option<String>,
    /// Bytes of the decoded text to replace, and by what.
    range: Range<usize>,
    replacement: String,
}

/// A file with its marks as they should be.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Annotated {
    /// The whole file.
    pub bytes: Vec<u8>,
    /// What differs from the file as it was, in order.
    pub changes: Vec<Change>,
    /// Diode lines of this file.
    pub marks: usize,
}

/// What becomes of the diodes that stand in one file, as one circuit sees it.
#[derive(Debug, Clone, PartialEq)]
pub struct FileMarks {
    /// The file, as the circuit names it.
    pub name: String,
    /// Lives of the diodes by the first byte of their statement.
    lives: BTreeMap<u32, Vec<Life>>,
}

impl FileMarks {
    /// Of a file of which nothing is known but its name.
    pub fn none(name: String) -> Self {
        FileMarks { name, lives: BTreeMap::new() }
    }

    /// Diode lines.
    pub fn count(&self) -> usize {
        self.lives.len()
    }
}

/// What a file is to the netlists of a run.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Role {
    /// A netlist: its first line is the title, and a mark behind anything but a diode goes.
    Root,
    /// Included: it has no title, and what this run does not reach (a section, a subcircuit that nobody here uses) keeps
    /// its marks, since other netlists may reach it.
    Part,
}

/// What the circuit of `analysis` says of each of its files; the first is the root.
pub fn file_marks(analysis: &Analysis) -> Vec<FileMarks> {
    let named = |file: &SourceFile| FileMarks { name: file.name.clone(), lives: BTreeMap::new() };
    let mut files: Vec<FileMarks> = analysis.sources.files().map(|(_, file)| named(file)).collect();
    for (statement, lives) in lives(analysis) {
        if let Some(file) = files.get_mut(statement.file.0 as usize) {
            file.lives.insert(statement.start, lives);
        }
    }
    files
}

/// The root file of `analysis` with a mark behind every diode; `original` are the bytes it was read from.
pub fn annotate(analysis: &Analysis, original: &[u8]) -> Annotated {
    let files = file_marks(analysis);
    annotate_file(original, Role::Root, &files.iter().take(1).collect::<Vec<_>>())
}

/// A file with a mark behind every diode of it that one of the circuits has; `original` are its bytes, `seen` what each
/// circuit says of it. A mark that says the same, but for noise in the last digit, stays as it is.
pub fn annotate_file(original: &[u8], role: Role, seen: &[&FileMarks]) -> Annotated {
    let mut together: BTreeMap<u32, Vec<Life>> = BTreeMap::new();
    for (&statement, lives) in seen.iter().flat_map(|marks| &marks.lives) {
        together.entry(statement).or_default().extend(lives.iter().cloned());
    }
    let wanted: BTreeMap<u32, String> = together.iter().map(|(at, lives)| (*at, words(lives))).collect();
    let mut sources = Sources::default();
    let file = sources.add("", original);
    let Some(decoded) = sources.get(file) else {
        return Annotated { bytes: original.to_vec(), changes: Vec::new(), marks: 0 };
    };
    let mut changes = changes(&decoded.text, role, &wanted);
    for change in &mut changes {
        change.line = sources.positions(Span::new(file, change.range.start, change.range.end)).0.line;
    }
    let bytes = apply(original, decoded.encoding, &changes);
    Annotated { bytes, changes, marks: wanted.len() }
}

/// The netlist without its marks.
pub fn strip(original: &[u8]) -> Vec<u8> {
    let (text, encoding) = decode(original);
    apply(original, encoding, &every_mark_gone(&text, Role::Root))
}

/// A file that is included without its marks.
pub fn strip_part(original: &[u8]) -> Vec<u8> {
    let (text, encoding) = decode(original);
    apply(original, encoding, &every_mark_gone(&text, Role::Part))
}

/// Makes the edits in the bytes of the file.
fn apply(original: &[u8], encoding: Encoding, changes: &[Change]) -> Vec<u8> {
    let places: Vec<usize> = changes.iter().flat_map(|c| [c.range.start, c.range.end]).collect();
    let offsets = original_offsets(original, encoding, &places);
    let mut bytes = Vec::with_capacity(original.len() + 32 * changes.len());
    let mut done = 0;
    for (change, ends) in changes.iter().zip(offsets.as_chunks::<2>().0) {
        bytes.extend_from_slice(original.get(done..ends[0]).unwrap_or_default());
        bytes.extend(encode(&change.replacement, encoding));
        done = ends[1];
    }
    bytes.extend_from_slice(original.get(done..).unwrap_or_default());
    bytes
}

/// The edits of a text, in order. `wanted` holds the marks by the first byte of their statement.
fn changes(text: &str, role: Role, wanted: &BTreeMap<u32, String>) -> Vec<Change> {
    let is_left_alone = |line: &Line| {
        let letter = text.as_bytes().get(line.start as usize);
        role == Role::Part && matches!(letter, Some(b'd' | b'D')) && !wanted.contains_key(&line.start)
    };
    edits(text, role, |line| (!is_left_alone(line)).then(|| wanted.get(&line.start)))
}

fn every_mark_gone(text: &str, role: Role) -> Vec<Change> {
    edits(text, role, |_| Some(None))
}

/// The edits of the statements to which `wanted` gives a mark or none; what it knows nothing of stays.
fn edits<'w>(text: &str, role: Role, wanted: impl Fn(&Line) -> Option<Option<&'w String>>) -> Vec<Change> {
    let (mut changes, mut buffer) = (Vec::new(), Vec::new());
    let cut = lines(text, role == Role::Root);
    for line in cut.lines.iter().filter(|l| l.kind == LineKind::Element) {
        let Some(mark) = wanted(line) else { continue };
        // a statement that cannot be cut up has no end to put a mark at
        if tokens(text, line.start, line.end, &mut buffer).is_ok() {
            statement(text, line, &buffer, mark, &mut changes);
        }
    }
    changes
}

/// The edits of one statement: marks on any but its last line go, the one on the last is put right.
fn statement(text: &str, line: &Line, tokens: &[Token], wanted: Option<&String>, out: &mut Vec<Change>) {
    let name = tokens.first().and_then(|t| text.get(t.start as usize..t.end as usize)).unwrap_or("");
    let mut start = line.start as usize;
    let end = line.end as usize;
    let whole = text.get(start..end).unwrap_or("");
    for physical in whole.split_inclusive('\n') {
        let last = start + physical.len() == end;
        let shown = physical.trim_end_matches(|c: char| c <= ' ');
        let line_end = start + shown.len();
        let is_comment = shown.trim_start_matches(|c: char| c <= ' ').starts_with(['*', ';', '$']);
        if !is_comment || last {
            let from = comment_start(tokens, start, line_end);
            let mut marks = marks_in(text, from..line_end).into_iter();
            out.extend(edit(text, name, marks.next(), line_end, wanted.filter(|_| last)));
            out.extend(marks.filter_map(|mark| edit(text, name, Some(mark), line_end, None)));
        }
        start += physical.len();
    }
}

/// Where what is no token begins on a physical line: its trailing blanks and comment.
fn comment_start(tokens: &[Token], start: usize, end: usize) -> usize {
    let before = tokens.partition_point(|t| (t.start as usize) < end);
    let last = before.checked_sub(1).and_then(|n| tokens.get(n));
    last.map_or(start, |t| (t.end as usize).clamp(start, end))
}

/// The marks in a trailing comment, each with its sign. What only begins like one is a person's and stays; so is what
/// follows one behind a `;`.
fn marks_in(text: &str, comment: Range<usize>) -> Vec<Range<usize>> {
    let Some(inside) = text.get(comment.clone()) else { return Vec::new() };
    let found = inside.match_indices(SIGN).filter_map(|(at, _)| {
        let said = inside.get(at + SIGN.len()..)?;
        let said = said.split(';').next().unwrap_or("").trim_end_matches(|c: char| c <= ' ');
        let start = comment.start + at;
        (said.starts_with([' ', '\t']) && is_mark(said)).then(|| start..start + SIGN.len() + said.len())
    });
    found.collect()
}

/// What becomes of one mark, or where there is none, of the line's end.
fn edit(
    text: &str,
    name: &str,
    mark: Option<Range<usize>>,
    line_end: usize,
    wanted: Option<&String>,
) -> Option<Change> {
    let said =
        |range: &Range<usize>| text.get(range.start + SIGN.len()..range.end).unwrap_or("").trim().to_owned();
    let old = mark.as_ref().map(said);
    let (range, replacement) = match (mark, wanted) {
        (None, None) => return None,
        (Some(_), Some(new)) if old.as_deref().is_some_and(|old| agree(old, new)) => return None,
        (Some(range), Some(new)) => (range, format!("{SIGN} {new}")),
        (None, Some(new)) => (line_end..line_end, format!(" {SIGN} {new}")),
        (Some(range), None) => {
            // the blank before the mark came with it
            let blank = text.get(..range.start).is_some_and(|t| t.ends_with([' ', '\t']));
            (range.start - usize::from(blank)..range.end, String::new())
        }
    };
    Some(Change { line: 0, name: name.to_owned(), old, new: wanted.cloned(), range, replacement })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::analyse;
    use crate::config::Options;
    use crate::text::Memory;
    use std::path::Path;

    fn annotated(bytes: &[u8]) -> Annotated {
        let options = Options { states: true, swing: true, ..Options::default() };
        let analysis = analyse(&mut Memory::with("a.net", bytes), Path::new("a.net"), &options).unwrap();
        annotate(&analysis, bytes)
    }

    /// What `root` says of the file that it includes.
    fn part_of(root: &str, part: &str) -> FileMarks {
        let mut files = Memory::with("a.net", root);
        files.insert("part.inc", part);
        let options = Options { states: true, ..Options::default() };
        let analysis = analyse(&mut files, Path::new("a.net"), &options).unwrap();
        file_marks(&analysis).pop().unwrap()
    }

    #[test]
    fn a_file_that_several_circuits_include_speaks_for_all_of_them() {
        let part = "D1 a 0 DX ;@ open\n.subckt S p\nD2 p 0 DX ;@ blocking\nR2 p 0 1k ;@ blocking\n.ends\n";
        let root = |volts: &str| {
            format!("t\nV1 in 0 {volts}\nR1 in a 1k\n*@ drop DX 0.7\n.model DX D\n.include part.inc\n")
        };
        let (high, low) = (part_of(&root("5"), part), part_of(&root("-5"), part));
        assert_eq!((high.name.as_str(), high.count()), ("part.inc", 1));
        let text = |seen: &[&FileMarks]| {
            String::from_utf8(annotate_file(part.as_bytes(), Role::Part, seen).bytes).unwrap()
        };
        assert!(text(&[&high]).starts_with(&format!("D1 a 0 DX {MARK}\n")));
        let both = text(&[&high, &low]);
        assert!(
            both.starts_with("D1 a 0 DX ;@ in 2 instances: 1 conducting 4.30mA | 1 blocking\n"),
            "{both}"
        );
        // nobody here uses the subcircuit, but somebody else may
        assert!(both.contains("D2 p 0 DX ;@ blocking\n"), "{both}");
        assert!(both.contains("R2 p 0 1k\n"), "{both}");
        assert_eq!(
            strip_part(both.as_bytes()),
            part.replace(" ;@ open", "").replace(" ;@ blocking", "").as_bytes()
        );
    }

    fn text_of(bytes: &[u8]) -> String {
        String::from_utf8(annotated(bytes).bytes).unwrap()
    }

    const HEAD: &str = "t\nV1 in 0 5\nR1 in a 1k\n*@ drop DX 0.7\n.model DX D\n";

    /// The line of D1 when `line` stands in the file.
    fn marked(line: &str) -> String {
        let text = text_of(format!("{HEAD}{line}\n.end\n").as_bytes());
        text[HEAD.len()..].strip_suffix("\n.end\n").unwrap().to_owned()
    }

    const MARK: &str = ";@ conducting 4.30mA 0.700V";

    #[test]
    fn a_mark_stands_at_the_end_of_the_last_line() {
        assert_eq!(marked("D1 a 0 DX"), format!("D1 a 0 DX {MARK}"));
        assert_eq!(marked("D1 a 0 DX  \t"), format!("D1 a 0 DX {MARK}  \t"));
        assert_eq!(marked("D1 a 0 DX ; clamp"), format!("D1 a 0 DX ; clamp {MARK}"));
        assert_eq!(marked("D1 a 0 DX $ clamp"), format!("D1 a 0 DX $ clamp {MARK}"));
        assert_eq!(marked("D1 a\n* why\n\n+ 0 DX"), format!("D1 a\n* why\n\n+ 0 DX {MARK}"));
        assert_eq!(marked("D1 a 0 DX\r"), format!("D1 a 0 DX {MARK}\r"));
    }

    #[test]
    fn marks_are_renewed_where_they_stand_and_go_where_no_diode_is() {
        assert_eq!(marked("D1 a 0 DX   ;@ blocking -3.20V"), format!("D1 a 0 DX   {MARK}"));
        assert_eq!(marked("D1 a 0 DX ; clamp ;@ blocking"), format!("D1 a 0 DX ; clamp {MARK}"));
        assert_eq!(marked("D1 a ;@ blocking\n+ 0 DX"), format!("D1 a\n+ 0 DX {MARK}"));
        assert_eq!(marked("D1 a 0 DX ;@ conducting 4.31mA 0.7V"), "D1 a 0 DX ;@ conducting 4.31mA 0.7V");
        // what only looks like one stays
        assert_eq!(marked("D1 a 0 DX ;@todo"), format!("D1 a 0 DX ;@todo {MARK}"));
        assert_eq!(marked("R2 a 0 1k ;@ conducting 4.30mA"), "R2 a 0 1k");
        assert_eq!(marked("*D1 a 0 DX ;@ blocking"), "*D1 a 0 DX ;@ blocking");
    }

    #[test]
    fn a_persons_words_stay_whatever_they_begin_with() {
        for words in [
            ";@ todo: check",
            ";@",
            ";@ blocking?",
            ";@ blocking in the cold",
            ";@ conducting 4.30mA measured",
            ";@ open question",
            ";@ see X | Y",
        ] {
            let line = format!("D1 a 0 DX {words}");
            assert_eq!(marked(&line), format!("{line} {MARK}"));
            let other = format!("R2 a 0 1k {words}");
            assert_eq!(marked(&other), other);
            assert_eq!(strip(line.as_bytes()), line.as_bytes());
        }
        let line = "D1 a 0 DX ;@ blocking -3V ; pressure cell";
        assert_eq!(marked(line), format!("D1 a 0 DX {MARK} ; pressure cell"));
        assert_eq!(marked("R2 a 0 1k ;@ blocking -3V ; pressure cell"), "R2 a 0 1k ; pressure cell");
        assert_eq!(strip(format!("t\n{line}\n").as_bytes()), b"t\nD1 a 0 DX ; pressure cell\n");
        // one mark is enough
        assert_eq!(marked("D1 a 0 DX ;@ blocking -3V ;@ todo ;@ open"), format!("D1 a 0 DX {MARK} ;@ todo"));
    }

    #[test]
    fn conditions_and_instances_show_in_the_mark() {
        let range = HEAD.replace("*@ drop", "*@ range V1 -9 9\n*@ drop") + "D1 a 0 DX\n";
        assert!(
            text_of(range.as_bytes())
                .ends_with("D1 a 0 DX ;@ conducting 4.30mA..8.30mA | blocking at V1=-9\n")
        );
        let many = "t\nV1 p 0 5\nV2 n 0 -5\nX1 p S\nX2 p S\nX3 n S\n.subckt S in\nR1 in m 1k\nD1 m 0 DX\n.ends\n\
                    .model DX D\n*@ drop DX 0.7\n";
        assert!(
            text_of(many.as_bytes())
                .contains("D1 m 0 DX ;@ in 3 instances: 2 conducting 4.30mA | 1 blocking\n")
        );
        let alike = many.replace("0 -5", "0 5");
        assert!(text_of(alike.as_bytes()).contains(";@ in 3 instances: conducting 4.30mA 0.700V\n"));
        assert!(
            text_of(b"t\nV1 in 0 5\nD1 in c DX\nQ1 c b 0 QN\n.model DX D\n.model QN NPN\n")
                .contains("D1 in c DX ;@ not evaluated\n")
        );
        assert!(
            text_of(b"t\nV1 in 0 -5\nR1 in a 1k\nD1 a 0 DZ\n.model DZ D(BV=3)\n")
                .contains("D1 a 0 DZ ;@ breakdown 2.00mA -3.00V\n")
        );
    }

    #[test]
    fn a_diode_that_an_instant_cannot_judge_shows_its_states_over_time() {
        let supply = "t\nV1 in 0 SIN(0 20 50)\nD1 in out DX\nR1 out 0 1k\nC1 out 0 10u\n.model DX D\n";
        assert!(text_of(supply.as_bytes()).contains("D1 in out DX ;@ blocking | conducting over time\n"));
        let plain = supply.replace("C1 out 0 10u\n", "");
        assert!(
            text_of(plain.as_bytes()).contains("D1 in out DX ;@ blocking | conducting 19.3mA at V1=max\n")
        );
    }

    #[test]
    fn a_missing_last_line_end_stays_missing() {
        let text = format!("{HEAD}D1 a 0 DX");
        assert_eq!(text_of(text.as_bytes()), format!("{text} {MARK}"));
    }

    #[test]
    fn every_encoding_keeps_its_bytes() {
        let text = format!("{HEAD}* Größe µ\r\nD1 a 0 DX\r\n");
        let expected = text.replace("0 DX\r", &format!("0 DX {MARK}\r"));
        let latin = |t: &str| t.chars().map(|c| u8::try_from(u32::from(c)).unwrap()).collect::<Vec<u8>>();
        let wide = |t: &str| {
            let units = t.encode_utf16().flat_map(u16::to_be_bytes);
            [0xFE, 0xFF].into_iter().chain(units).collect::<Vec<u8>>()
        };
        for encoded in [&|t: &str| t.as_bytes().to_vec(), &latin as &dyn Fn(&str) -> Vec<u8>, &wide] {
            assert_eq!(annotated(&encoded(&text)).bytes, encoded(&expected));
            assert_eq!(strip(&encoded(&expected)), encoded(&text));
        }
    }
}
