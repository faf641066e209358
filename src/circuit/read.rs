//! Files to blocks: follows includes, opens and closes subcircuits, keeps what each dot line declares.

use super::ModelKind;
use super::line::Line;
use super::parsed::{Block, ModelLine, Parsed, Setting, Statement};
use crate::config::Options;
use crate::finding::{Edit, Finding, Severity};
use crate::syntax::{self, Fields, Line as Cut, LineKind, Token, TokenKind};
use crate::text::{FileId, LoadProblem, Loader, Sources, Span};
use std::path::{Path, PathBuf};

/// The work in progress.
pub(super) struct Reader<'a> {
    pub loader: &'a mut dyn Loader,
    pub options: &'a Options,
    pub sources: Sources,
    pub parsed: Parsed,
    /// Paths of the files that are being read, outermost first.
    pub stack: Vec<PathBuf>,
    /// Subcircuit definitions that are open, the root first.
    pub open: Vec<usize>,
    pub boundary: PathBuf,
    fields: Fields,
}

/// Reads `root` and everything it includes.
pub(super) fn read_files(
    loader: &mut dyn Loader,
    root: &Path,
    options: &Options,
) -> Result<(Sources, Parsed), LoadProblem> {
    let bytes = loader.load(root)?;
    let boundary = loader.boundary(root);
    let mut reader = Reader {
        loader,
        options,
        sources: Sources::default(),
        parsed: Parsed::default(),
        stack: Vec::new(),
        open: vec![0],
        boundary,
        fields: Fields::default(),
    };
    reader.stack.push(reader.loader.resolve(root));
    reader.file(root, &bytes, None, None);
    reader.stack.pop();
    reader.unclosed(1);
    Ok((reader.sources, reader.parsed))
}

impl Reader<'_> {
    /// Reads one file, or one section of it, into the open block.
    pub(super) fn file(&mut self, path: &Path, bytes: &[u8], from: Option<Span>, section: Option<&str>) {
        let file = self.sources.add(path.display().to_string(), bytes);
        let is_root = from.is_none();
        self.parsed.includes.push(from);
        let cut = syntax::lines(self.text(file), is_root);
        if let Some((start, end)) = cut.title {
            let title = Span { file, start, end };
            self.parsed.title = Some(title);
            self.parsed.blocks[0].statement = title;
            self.title(title);
        }
        let lines = self.section(file, &cut.lines, section);
        let mut at = 0;
        while let Some(line) = lines.get(at) {
            at += 1;
            let span = Span { file, start: line.start, end: line.end };
            match line.kind {
                LineKind::Element => self.keep(span, false),
                LineKind::Note => self.keep(span, true),
                LineKind::Stray => self.stray(span),
                LineKind::Dot => match self.dot(span, &lines[at..]) {
                    Next::Line => {}
                    Next::Skip(count) => at += count,
                    Next::End => {
                        self.after_end(file, &lines[at..], is_root);
                        break;
                    }
                },
            }
        }
    }

    fn text(&self, file: FileId) -> &str {
        self.sources.get(file).map_or("", |f| f.text.as_str())
    }

    fn keep(&mut self, span: Span, is_note: bool) {
        let number = self.parsed.statements.len();
        self.parsed.statements.push(Statement { span, is_note });
        let body = &mut self.block().body;
        match body.last_mut() {
            Some(last) if last.end == number => last.end += 1,
            _ => body.push(number..number + 1),
        }
    }

    pub(super) fn block(&mut self) -> &mut Block {
        let open = self.open.last().copied().unwrap_or(0);
        &mut self.parsed.blocks[open]
    }

    pub(super) fn tell(&mut self, finding: Finding) {
        self.parsed.findings.push(finding);
    }

    fn title(&mut self, span: Span) {
        let text = self.sources.slice(span);
        let mut fields = Fields::default();
        if fields.read(text, 0, span.end - span.start).is_err() || !reads_as_element(text, &fields) {
            return;
        }
        let name = text.split_whitespace().next().unwrap_or("");
        let finding = Finding::new(
            "title-reads-as-element",
            Severity::Warning,
            span,
            format!("line 1 is the title and never an element, yet it reads as the element {name}"),
        )
        .label("taken as the title")
        .about(name)
        .help("if it is an element, put a title line above it; if it is a title, begin it with a word that is no element")
        .fix("put a title line above it", vec![Edit { span: Span { end: span.start, ..span }, replacement: "Circuit\n".into() }]);
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
        .help("what stands on it is lost; put it behind the statement it belongs to, or remove it");
        self.tell(finding);
    }

    fn after_end(&mut self, file: FileId, rest: &[Cut], is_root: bool) {
        let (Some(first), true) = (rest.first(), is_root) else { return };
        let count = rest.len();
        let lines = if count == 1 { "1 line stands".to_owned() } else { format!("{count} lines stand") };
        let finding = Finding::new(
            "text-after-end",
            Severity::Note,
            Span { file, start: first.start, end: first.end },
            format!("{lines} behind .end and nothing there is read"),
        )
        .label("not read from here on")
        .help("move it above .end if it belongs to the circuit");
        self.tell(finding);
    }

    /// Only the lines of a `.lib` section; all but sections where none is asked for.
    fn section(&mut self, _file: FileId, lines: &[Cut], _section: Option<&str>) -> Vec<Cut> {
        lines.to_vec()
    }

    fn dot(&mut self, span: Span, rest: &[Cut]) -> Next {
        let mut fields = std::mem::take(&mut self.fields);
        let text = self.sources.get(span.file).map_or("", |f| f.text.as_str()).to_owned();
        let broken = fields.read(&text, span.start, span.end).err();
        let line = Line { text: &text, span, fields };
        if let Some(broken) = broken {
            let at = Span { file: span.file, start: broken.start, end: span.end };
            let word = line.word_str(0).to_owned();
            self.parsed.incomplete = true;
            self.tell(
                Finding::new(
                    "unreadable-line",
                    Severity::Error,
                    at,
                    format!("{word} cannot be read to its end: {}", broken.what),
                )
                .label(broken.what)
                .about(word)
                .help("close it on this statement; what stands before it has been read"),
            );
        }
        let next = self.dot_line(&line, rest);
        self.fields = line.fields;
        next
    }

    fn dot_line(&mut self, line: &Line<'_>, _rest: &[Cut]) -> Next {
        let word = line.word_str(0).trim_start_matches('.').to_ascii_lowercase();
        match word.as_str() {
            "end" => return Next::End,
            "model" => self.model(line),
            "temp" => self.temp(line),
            "options" | "option" | "opt" => self.options(line),
            "dc" => self.parsed.sweeps.push(spans(line, 1)),
            "tran" => self.parsed.transient = Some(spans(line, 1)),
            "global" => self.parsed.globals.extend(spans(line, 1)),
            _ => {}
        }
        Next::Line
    }

    /// `model-line = ".model" name type *pair`
    fn model(&mut self, line: &Line<'_>) {
        let (Some(name), Some(kind)) = (line.word(1), line.word(2)) else {
            self.parsed.incomplete = true;
            let finding = Finding::new(
                "unreadable-line",
                Severity::Error,
                line.span,
                "this .model line lacks its name or its type",
            )
            .label("not read")
            .help("write it as .model NAME TYPE (KEY=VALUE …)");
            return self.tell(finding);
        };
        let number = self.parsed.models.len();
        self.parsed.models.push(ModelLine {
            name_span: line.at(name),
            statement: line.span,
            kind: model_kind(line.str(kind)),
            settings: settings(line),
        });
        let key = line.str(name).to_ascii_lowercase();
        self.block().models.insert(key, number);
    }

    /// `temp-line = ".temp" value`
    fn temp(&mut self, line: &Line<'_>) {
        if let Some(token) = line.word(1) {
            let value = line.at(token);
            self.parsed.options.push(Setting { name: "temp".into(), name_span: line.head(), value });
        }
    }

    /// `options-line = ".options" *( word / pair )`
    fn options(&mut self, line: &Line<'_>) {
        self.parsed.options.extend(settings(line));
    }

    fn unclosed(&mut self, _from: usize) {}
}

/// What to read next.
enum Next {
    Line,
    Skip(usize),
    End,
}

/// All pairs of a line.
pub(super) fn settings(line: &Line<'_>) -> Vec<Setting> {
    line.fields
        .pairs
        .iter()
        .map(|p| Setting {
            name: line.str(p.key).to_ascii_lowercase(),
            name_span: line.at(p.key),
            value: line.at(p.value),
        })
        .collect()
}

fn spans(line: &Line<'_>, from: usize) -> Vec<Span> {
    (from..line.len()).filter_map(|n| line.word(n)).map(|t| line.at(t)).collect()
}

fn model_kind(word: &str) -> ModelKind {
    match word.to_ascii_lowercase().as_str() {
        "d" => ModelKind::Diode,
        "npn" => ModelKind::Npn,
        "pnp" => ModelKind::Pnp,
        "nmos" => ModelKind::Nmos,
        "pmos" => ModelKind::Pmos,
        "njf" => ModelKind::Njf,
        "pjf" => ModelKind::Pjf,
        "sw" => ModelKind::VoltageSwitch,
        "csw" => ModelKind::CurrentSwitch,
        "r" | "res" => ModelKind::Resistor,
        "c" | "cap" => ModelKind::Capacitor,
        "l" | "ind" => ModelKind::Inductor,
        _ => ModelKind::Other,
    }
}

/// Whether a title is a complete element: a name that begins with its letter, nodes, and a value or model.
fn reads_as_element(text: &str, fields: &Fields) -> bool {
    let str = |t: &Token| text.get(t.start as usize..t.end as usize).unwrap_or("");
    let words: Vec<&str> = fields.words.iter().map(str).collect();
    let Some(name) = words.first() else { return false };
    let mut letters = name.chars();
    let letter = letters.next().unwrap_or(' ').to_ascii_uppercase();
    let numbered = letters.next().is_some_and(|c| c.is_ascii_digit());
    let is_value = |n: usize| {
        words.get(n).is_some_and(|w| syntax::number(w.as_bytes()).is_some())
            || fields.words.get(n).is_some_and(|t| t.kind == TokenKind::Expression)
    };
    match letter {
        'R' | 'C' | 'L' | 'V' | 'I' => is_value(3) && words.len() <= 6 && (numbered || words.len() == 4),
        'D' => numbered && words.len() == 4,
        'Q' | 'J' => numbered && matches!(words.len(), 5 | 6),
        _ => false,
    }
}
