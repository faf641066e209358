//! Dot lines: what each declares. Lines that ask for an analysis or an output are passed over.

use super::ModelKind;
use super::line::Line;
use super::parsed::{Function, ModelLine, Setting};
use super::read::{Closers, Reader};
use crate::finding::{Edit, Finding, Severity, count};
use crate::syntax::{self, TokenKind};
use crate::text::{Span, nearest};

/// What to read next.
pub(super) enum Next {
    /// The next line.
    Line,
    /// The line of that number.
    From(usize),
    /// Nothing: `.end`.
    End,
}

/// Dot lines that mean something here.
const KNOWN: [&str; 22] = [
    "model", "subckt", "ends", "param", "global", "include", "inc", "lib", "endl", "temp", "options",
    "option", "opt", "ic", "nodeset", "dc", "tran", "end", "params", "func", "incl", "macro",
];
/// Dot lines that ask for an analysis or an output, or say something to other tools.
const PASSED_OVER: [&str; 18] = [
    "ac", "op", "print", "plot", "probe", "save", "meas", "measure", "four", "fft", "noise", "disto", "pz",
    "sens", "tf", "step", "width", "title",
];

impl Reader<'_> {
    /// Reads the dot line under `span`; `next` is the number of the line behind it.
    pub(super) fn dot(&mut self, span: Span, next: usize, closers: &Closers) -> Next {
        let mut fields = std::mem::take(&mut self.fields);
        let text = self.sources.slice(span).to_owned();
        let broken = fields.read(&text, 0, span.end - span.start).err();
        let line = Line { text: &text, base: span.start, span, fields };
        let word = line.word_str(0).trim_start_matches('.').to_ascii_lowercase();
        if broken.is_some() && !KNOWN.contains(&word.as_str()) {
            let head = line.head();
            self.fields = line.fields;
            return self.foreign(head, &word, next, closers);
        }
        if let Some(broken) = broken {
            self.tell_broken(&line, broken);
        }
        let next = self.dot_line(&line, &word, next, closers);
        self.fields = line.fields;
        next
    }

    fn tell_broken(&mut self, line: &Line<'_>, broken: syntax::Broken) {
        let at = Span { start: line.base + broken.start, ..line.span };
        let word = line.word_str(0);
        self.parsed.incomplete = true;
        let message = format!("{word} cannot be read to its end: {}", broken.what);
        let finding = Finding::new("unreadable-line", Severity::Error, at, message)
            .label(broken.what)
            .about(word)
            .help("Close it on this statement; what stands before it has been read.");
        self.tell(finding);
    }

    /// `dot-line = model-line / subckt-line / …`
    fn dot_line(&mut self, line: &Line<'_>, word: &str, next: usize, closers: &Closers) -> Next {
        match word {
            "end" => return Next::End,
            "model" => self.model_line(line),
            "subckt" | "macro" => self.subckt_line(line),
            "ends" | "eom" => self.ends_line(line),
            "param" | "params" => self.param_line(line),
            "func" => self.func_line(line),
            "include" | "inc" | "incl" => self.include_line(line),
            "lib" => self.lib_line(line),
            "temp" => self.temp_line(line),
            "options" | "option" | "opt" => self.parsed.options.extend(settings(line)),
            "dc" => self.parsed.sweeps.push(spans(line, 1)),
            "tran" => self.parsed.transient = Some(spans(line, 1)),
            "global" => self.parsed.globals.extend(spans(line, 1)),
            "ic" => self.ic_line(line),
            "nodeset" | "endl" => {}
            _ => return self.foreign(line.head(), word, next, closers),
        }
        Next::Line
    }

    /// A dot line that means nothing here: passed over with its block, or told.
    fn foreign(&mut self, place: Span, word: &str, next: usize, closers: &Closers) -> Next {
        if let Some(close) = closing(word, next, closers) {
            if word == "if" {
                // what a condition keeps or drops is not known, so nothing may be concluded from what is missing
                self.parsed.incomplete = true;
                self.tell_condition(place, close.saturating_sub(next));
            }
            return Next::From(close + 1);
        }
        let closes_nothing_new = word.starts_with("end") && word.len() > 3;
        if PASSED_OVER.contains(&word)
            || !self.told_words.insert(word.to_owned())
            || closes_nothing_new && nearest(word, KNOWN).is_none()
        {
            return Next::Line;
        }
        if self.is_full("unknown-dot-line") {
            // to look for the nearest word would take long
            self.count("unknown-dot-line");
            return Next::Line;
        }
        let mut finding = Finding::new(
            "unknown-dot-line",
            Severity::Note,
            place,
            format!(".{word} means nothing here and is passed over"),
        )
        .label("not known")
        .about(format!(".{word}"))
        .help("If another tool reads it, nothing is wrong; if not, it has no effect.");
        if let Some(near) = nearest(word, KNOWN) {
            finding.help = format!("Did you mean `.{near}`? As it stands it has no effect.");
            let edit = Edit { span: place, replacement: format!(".{near}") };
            finding = finding.fix(format!("write `.{near}`"), vec![edit]);
        }
        self.tell(finding);
        Next::Line
    }

    fn tell_condition(&mut self, place: Span, lines: usize) {
        if lines == 0 {
            return;
        }
        let (lines, stand) = (count(lines, "statement"), if lines == 1 { "stands" } else { "stand" });
        let message = format!(
            "{lines} {stand} between .if and .endif: conditions are not decided here, so nothing of it is read and the \
             circuit is incomplete"
        );
        let finding = Finding::new("conditional-lines", Severity::Warning, place, message)
            .label("not read up to its .endif")
            .help("Take the lines that hold out of the condition, or choose them by an include.");
        self.tell(finding);
    }

    /// `model-line = ".model" name type *pair`
    fn model_line(&mut self, line: &Line<'_>) {
        let (Some(name), Some(kind)) = (line.word(1), line.word(2)) else {
            self.parsed.incomplete = true;
            let message = "this .model line lacks its name or its type";
            let finding = Finding::new("unreadable-line", Severity::Error, line.span, message)
                .label("not read")
                .about(line.word_str(1))
                .help("Write it as `.model NAME TYPE (KEY=VALUE …)`.");
            return self.tell(finding);
        };
        let number = self.parsed.models.len();
        let settings = settings(line);
        let is_constant =
            settings.iter().all(|s| syntax::number(self.sources.slice(s.value).as_bytes()).is_some());
        let (name_span, statement) = (line.at(name), line.span);
        self.parsed.models.push(ModelLine {
            name_span,
            statement,
            kind: model_kind(line.str(kind)),
            settings,
            is_constant,
        });
        let key = line.str(name).to_ascii_lowercase();
        if let Some(first) = self.block().models.insert(key, number) {
            let first = self.parsed.models.get(first).map(|m| (m.name_span, m.statement));
            self.tell_twice("model", name_span, statement, first);
        }
    }

    /// Two definitions of one name, unless they say the same.
    pub(super) fn tell_twice(
        &mut self,
        what: &str,
        name: Span,
        statement: Span,
        first: Option<(Span, Span)>,
    ) {
        let Some((first_name, first_statement)) = first else { return };
        if self.sources.slice(first_statement) == self.sources.slice(statement) {
            return;
        }
        let text = self.sources.slice(name);
        let finding = Finding::new(
            "defined-twice",
            Severity::Warning,
            name,
            format!("the {what} {text} is defined twice, and the two definitions differ"),
        )
        .label("this one counts")
        .also(first_name, "defined here before")
        .about(text)
        .help("Tools differ in which of the two they take; rename or remove one.");
        self.tell(finding);
    }

    /// `param-line = ".param" 1*( name "=" value )`
    fn param_line(&mut self, line: &Line<'_>) {
        let tokens = &line.fields.tokens;
        let starts: Vec<usize> = (1..tokens.len())
            .filter(|&n| tokens[n].kind == TokenKind::Equals && tokens[n - 1].kind == TokenKind::Word)
            .map(|n| n - 1)
            .collect();
        for (which, &start) in starts.iter().enumerate() {
            let end = starts.get(which + 1).copied().unwrap_or(tokens.len());
            let (Some(first), Some(last)) =
                (tokens.get(start + 2).filter(|_| start + 2 < end), tokens.get(end - 1))
            else {
                self.tell_bare_parameter(line, line.at(tokens[start]));
                continue;
            };
            let setting = Setting {
                name: line.str(tokens[start]).to_ascii_lowercase(),
                name_span: line.at(tokens[start]),
                value: line.at(*first).to(line.at(*last)),
            };
            self.block().parameters.push(setting);
        }
        if starts.is_empty() && !self.function_parameter(line) {
            self.tell_bare_parameter(line, line.span);
        }
    }

    fn tell_bare_parameter(&mut self, line: &Line<'_>, span: Span) {
        let message = format!("{} gives no value here", line.word_str(0));
        let finding = Finding::new("unreadable-line", Severity::Error, span, message)
            .label("no value")
            .help("Write it as `.param NAME=VALUE`.");
        self.tell(finding);
    }

    /// `.param f(x)=…`
    fn function_parameter(&mut self, line: &Line<'_>) -> bool {
        let is_function = line.fields.tokens.iter().any(|t| t.kind == TokenKind::Equals)
            && line.fields.tokens.get(2).is_some_and(|t| t.kind == TokenKind::Open);
        if is_function {
            self.func_line(line);
        }
        is_function
    }

    /// `func-line = ".func" name "(" *argument ")" ["="] value`
    fn func_line(&mut self, line: &Line<'_>) {
        let tokens = &line.fields.tokens;
        let close = tokens.iter().position(|t| t.kind == TokenKind::Close);
        let (Some(name), Some(close)) = (tokens.get(1), close) else {
            return self.tell_bare_parameter(line, line.span);
        };
        let arguments = tokens.get(3..close).unwrap_or_default().iter();
        let arguments = arguments.map(|t| line.str(*t).to_ascii_lowercase()).collect();
        let behind = if tokens.get(close + 1).is_some_and(|t| t.kind == TokenKind::Equals) {
            close + 2
        } else {
            close + 1
        };
        let (Some(first), Some(last)) = (tokens.get(behind), tokens.last()) else {
            return self.tell_bare_parameter(line, line.span);
        };
        let body = line.at(*first).to(line.at(*last));
        self.parsed.functions.insert(line.str(*name).to_ascii_lowercase(), Function { arguments, body });
    }

    /// `temp-line = ".temp" value`
    fn temp_line(&mut self, line: &Line<'_>) {
        if let Some(token) = line.word(1) {
            let value = line.at(token);
            self.parsed.options.push(Setting { name: "temp".into(), name_span: line.head(), value });
        }
        if let (Some(from), Some(last)) = (line.word(2), line.word(line.len() - 1)) {
            self.tell_more_temperatures(line, line.at(from).to(line.at(last)));
        }
    }

    /// Each further temperature of `.temp` asks for a run of its own.
    fn tell_more_temperatures(&mut self, line: &Line<'_>, span: Span) {
        let values: Vec<(f64, &str)> = (1..line.len())
            .map(|n| line.word_str(n))
            .filter_map(|text| syntax::sound_number(text).map(|number| (number.value, text)))
            .collect();
        let coldest = values.iter().min_by(|a, b| a.0.total_cmp(&b.0));
        let hottest = values.iter().max_by(|a, b| a.0.total_cmp(&b.0));
        let help = match (coldest, hottest) {
            (Some(low), Some(high)) => {
                format!(
                    "To examine the coldest and the hottest too, write `*@ range temp {} {}`.",
                    low.1, high.1
                )
            }
            _ => "To examine further temperatures, write `*@ range temp LOW HIGH`.".to_owned(),
        };
        let message = format!(
            "of the {} temperatures of this line only the first counts: everything is examined at {} °C",
            line.len() - 1,
            line.word_str(1)
        );
        let finding = Finding::new("surplus-word", Severity::Note, span, message)
            .label("not examined")
            .about(".temp")
            .help(help);
        self.tell(finding);
    }

    /// `ic-line = ".ic" 1*( "v(" node ")" "=" value )`
    fn ic_line(&mut self, line: &Line<'_>) {
        for window in line.fields.tokens.windows(6) {
            let kinds: Vec<TokenKind> = window.iter().map(|t| t.kind).collect();
            let fits = matches!(
                kinds.as_slice(),
                [TokenKind::Word, TokenKind::Open, TokenKind::Word, TokenKind::Close, TokenKind::Equals, _]
            );
            if fits && line.str(window[0]).eq_ignore_ascii_case("v") {
                let initial = (line.at(window[2]), line.at(window[5]));
                self.block().initial.push(initial);
            }
        }
    }
}

/// The line from `next` on that closes a foreign block of that word: `.end` and the word or its start.
fn closing(word: &str, next: usize, closers: &Closers) -> Option<usize> {
    let starts = word.char_indices().skip(1).map(|(at, _)| at).chain([word.len()]);
    let starts = starts.filter_map(|at| word.get(..at)).take(40);
    starts
        .filter_map(|tail| {
            let numbers = closers.get(tail)?;
            numbers.get(numbers.partition_point(|&n| n < next)).copied()
        })
        .min()
}

/// All pairs of a line.
pub(super) fn settings(line: &Line<'_>) -> Vec<Setting> {
    let setting = |p: &syntax::Pair| Setting {
        name: line.str(p.key).to_ascii_lowercase(),
        name_span: line.at(p.key),
        value: line.at(p.value),
    };
    line.fields.pairs.iter().map(setting).collect()
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
