//! Files to blocks: goes through the lines of each file, keeps elements and notes, and hands dot lines on.

use super::dot::Next;
use super::include::Found;
use super::parsed::{Block, Parsed, Statement};
use super::title::{reads_as_dot_line, reads_as_element};
use crate::config::Options;
use crate::finding::{Edit, Finding, Severity};
use crate::syntax::{self, Fields, Line as Cut, LineKind};
use crate::text::{FileId, LONGEST_FILE, LoadProblem, Loader, Sources, Span};
use rustc_hash::{FxHashMap, FxHashSet};
use std::path::{Path, PathBuf};

/// Longest statement that is read, in bytes, its continuation lines included.
pub(super) const LONGEST_STATEMENT: u32 = 1 << 20;

/// A file that is being read.
pub(super) struct Opened {
    pub path: PathBuf,
    /// The section asked for.
    pub section: Option<String>,
    /// It has no sections, so that all of it is read whatever was asked for.
    pub is_plain: bool,
}

/// The work in progress.
pub(super) struct Reader<'a> {
    pub loader: &'a mut dyn Loader,
    pub options: &'a Options,
    pub sources: Sources,
    pub parsed: Parsed,
    /// Files that are being read, outermost first.
    pub stack: Vec<Opened>,
    /// Where the files were found that were asked for from a folder.
    pub found: FxHashMap<(PathBuf, PathBuf), Found>,
    /// Subcircuit definitions that are open, the root first.
    pub open: Vec<usize>,
    /// Included files must lie below this.
    pub boundary: PathBuf,
    pub fields: Fields,
    /// Bytes of all files so far.
    pub bytes: usize,
    /// Unknown dot words that have been told: each is told once.
    pub told_words: FxHashSet<String>,
    /// How many findings of each rule there are.
    counts: FxHashMap<&'static str, usize>,
}

/// Reads `root` and everything it includes.
pub(super) fn read_files(
    loader: &mut dyn Loader,
    root: &Path,
    options: &Options,
) -> Result<(Sources, Parsed), LoadProblem> {
    let (bytes, length) = load(loader, root)?;
    let boundary = loader.boundary(root);
    let mut reader = Reader {
        loader,
        options,
        sources: Sources::default(),
        parsed: Parsed::default(),
        stack: Vec::new(),
        found: FxHashMap::default(),
        open: vec![0],
        boundary,
        fields: Fields::default(),
        bytes: 0,
        told_words: FxHashSet::default(),
        counts: FxHashMap::default(),
    };
    reader.stack.push(Opened { path: reader.loader.resolve(root), section: None, is_plain: false });
    reader.file(root, bytes, length, None, None);
    super::told::tell_rest(&mut reader.parsed.findings, &reader.counts);
    Ok((reader.sources, reader.parsed))
}

/// The bytes of a file and their number; one that is too long is not loaded.
pub(super) fn load(loader: &mut dyn Loader, path: &Path) -> Result<(Vec<u8>, usize), LoadProblem> {
    let length = loader.size(path).map_or(0, |size| usize::try_from(size).unwrap_or(usize::MAX));
    if length > LONGEST_FILE {
        return Ok((Vec::new(), length));
    }
    loader.load(path).map(|bytes| {
        let length = bytes.len();
        (bytes, length)
    })
}

/// The dot lines that may close a foreign block, by the word behind `.end`: their numbers in the file.
pub(super) type Closers = FxHashMap<String, Vec<usize>>;

impl Reader<'_> {
    /// Reads one file, or one section of it, into the open block.
    pub(super) fn file(
        &mut self,
        path: &Path,
        bytes: Vec<u8>,
        length: usize,
        from: Option<Span>,
        section: Option<&str>,
    ) {
        let too_long = length > LONGEST_FILE;
        self.bytes = self.bytes.saturating_add(bytes.len());
        let file = self.sources.add(path.display().to_string(), if too_long { Vec::new() } else { bytes });
        self.parsed.includes.push(from);
        if too_long {
            return self.tell_long_file(Span::new(file, 0, 0), length);
        }
        let is_root = from.is_none();
        let cut = syntax::lines(self.text(file), is_root);
        if let Some((start, end)) = cut.title {
            self.title(Span { file, start, end });
        }
        let lines = self.section(file, cut.lines, section, from);
        let open = self.open.len();
        self.lines(file, &lines, is_root);
        self.unclosed(open);
    }

    fn lines(&mut self, file: FileId, lines: &[Cut], is_root: bool) {
        let closers = self.closers(file, lines);
        if is_root {
            self.parsed.statements.reserve_exact(lines.len());
        }
        let mut at = 0;
        while let Some(line) = lines.get(at) {
            at += 1;
            let span = Span { file, start: line.start, end: line.end };
            if line.end - line.start > LONGEST_STATEMENT {
                self.tell_long_line(span);
                continue;
            }
            match line.kind {
                LineKind::Element | LineKind::Note => self.keep(span),
                LineKind::Stray => self.stray(span),
                LineKind::Dot => match self.dot(span, at, &closers) {
                    Next::Line => {}
                    Next::From(next) => at = next,
                    Next::End => return self.after_end(file, &lines[at..], is_root),
                },
            }
        }
    }

    pub(super) fn text(&self, file: FileId) -> &str {
        self.sources.get(file).map_or("", |f| f.text.as_str())
    }

    fn closers(&self, file: FileId, lines: &[Cut]) -> Closers {
        let text = self.text(file);
        let mut closers = Closers::default();
        for (number, line) in lines.iter().enumerate().filter(|(_, l)| l.kind == LineKind::Dot) {
            let statement = text.get(line.start as usize..line.end as usize).unwrap_or("");
            let word = statement.split(|c: char| c.is_whitespace() || c == ';').next();
            let word = word.unwrap_or("").to_ascii_lowercase();
            if let Some(tail) = word.strip_prefix(".end").filter(|tail| !matches!(*tail, "" | "s" | "l")) {
                closers.entry(tail.to_owned()).or_default().push(number);
            }
        }
        closers
    }

    fn keep(&mut self, span: Span) {
        let number = self.parsed.statements.len();
        self.parsed.statements.push(Statement { span });
        let body = &mut self.block().body;
        match body.last_mut() {
            Some(last) if last.end == number => last.end += 1,
            _ => body.push(number..number + 1),
        }
    }

    /// The innermost definition that is open.
    pub(super) fn block(&mut self) -> &mut Block {
        let open = self.open.last().copied().unwrap_or(0);
        &mut self.parsed.blocks[open]
    }

    /// Whether further findings of the rule are only counted.
    pub(super) fn is_full(&self, rule: &str) -> bool {
        self.counts.get(rule).is_some_and(|&count| count >= super::told::MOST_OF_ONE_RULE)
    }

    /// Counts a finding that is not listed.
    pub(super) fn count(&mut self, rule: &'static str) {
        *self.counts.entry(rule).or_default() += 1;
    }

    /// Keeps a finding, with the includes that lead to it; of one rule only so many.
    pub(super) fn tell(&mut self, mut finding: Finding) {
        let count = self.counts.entry(finding.rule).or_default();
        *count += 1;
        if *count <= super::told::MOST_OF_ONE_RULE {
            finding.trail = super::trail::includes(&self.parsed.includes, finding.span.file);
            self.parsed.findings.push(finding);
        }
    }

    fn title(&mut self, span: Span) {
        self.parsed.title = Some(span);
        self.parsed.blocks[0].statement = span;
        let text = self.sources.slice(span);
        let whole = self.sources.get(span.file).map_or("", |f| f.text.as_str());
        let rest = whole.get(span.end as usize..).unwrap_or("");
        let (name, message, help) = match (reads_as_element(text, rest), reads_as_dot_line(text)) {
            (Some(name), _) => (
                name,
                format!("line 1 is the title and never an element, yet it reads as the element {name}"),
                "If it is an element, put a title line above it; if it is a title, begin it with a word that is no element.",
            ),
            (None, Some(word)) => (
                word,
                format!("line 1 is the title, so this {word} line is not read"),
                "Put a title line above it; a file that is included needs none.",
            ),
            (None, None) => return,
        };
        let (name, is_dot) = (name.to_owned(), name.starts_with('.'));
        self.parsed.incomplete |= is_dot;
        let above = Edit { span: Span { end: span.start, ..span }, replacement: "Circuit\n".into() };
        let finding = Finding::new("title-reads-as-element", Severity::Warning, span, message)
            .label("taken as the title")
            .about(name)
            .help(help)
            .fix("put a title line above it", vec![above]);
        self.tell(finding);
    }

    fn stray(&mut self, span: Span) {
        self.parsed.incomplete = true;
        let finding = Finding::new(
            "stray-continuation",
            Severity::Warning,
            span,
            "this line begins with + and there is no statement above it to continue",
        )
        .label("continues nothing")
        .help("What stands on it is lost; put it behind the statement it belongs to, or remove it.");
        self.tell(finding);
    }

    fn after_end(&mut self, file: FileId, rest: &[Cut], is_root: bool) {
        let (Some(first), true) = (rest.first(), is_root) else { return };
        let lines = match rest.len() {
            1 => "1 statement stands".to_owned(),
            count => format!("{count} statements stand"),
        };
        let span = Span { file, start: first.start, end: first.end };
        let finding = Finding::new(
            "text-after-end",
            Severity::Note,
            span,
            format!("{lines} behind .end and nothing there is read"),
        )
        .label("not read from here on")
        .help("Move it above .end if it belongs to the circuit.");
        self.tell(finding);
    }

    fn tell_long_line(&mut self, span: Span) {
        self.parsed.incomplete = true;
        let length = span.end - span.start;
        let mut end = (span.start + 40) as usize;
        while !self.text(span.file).is_char_boundary(end) {
            end -= 1;
        }
        let finding = Finding::new(
            "limit-reached",
            Severity::Error,
            Span::new(span.file, span.start as usize, end),
            format!("this statement is {length} bytes long with its continuations, and at most {LONGEST_STATEMENT} are read"),
        )
        .label("not read")
        .help("Break it into several statements.");
        self.tell(finding);
    }

    fn tell_long_file(&mut self, span: Span, length: usize) {
        self.parsed.incomplete = true;
        let mebibytes = |bytes: usize| bytes.div_ceil(1 << 20);
        let (length, most) = (mebibytes(length), mebibytes(LONGEST_FILE));
        let message = format!("this file is {length} MiB long, and at most {most} MiB are read");
        let finding = Finding::new("limit-reached", Severity::Error, span, message)
            .label("not read")
            .help("Break it into several files, or check its parts one by one.");
        self.tell(finding);
    }
}
