//! Includes: where files are looked for, which may be opened, and the sections of libraries.

use super::line::Line;
use super::read::{Opened, Reader, load};
use crate::finding::{Finding, Severity};
use crate::syntax::{Line as Cut, LineKind, Token};
use crate::text::{FileId, Span, nearest};
use std::path::{Component, Path, PathBuf};

/// Files within files.
const DEEPEST: usize = 32;
/// Files of one root.
const MOST_FILES: usize = 10_000;
/// Bytes of all files of one root: a small file can include a large one a thousand times. Fewer in tests.
const MOST_BYTES: usize = if cfg!(test) { 1 << 20 } else { 1 << 30 };

/// What looking for a file gives.
#[derive(Clone)]
pub(super) enum Found {
    /// The path as it is shown, and as the file system resolves it.
    At(PathBuf, PathBuf),
    Outside,
    Nowhere,
}

impl Reader<'_> {
    /// `include-line = ".include" path`
    pub(super) fn include_line(&mut self, line: &Line<'_>) {
        match line.word(1) {
            Some(token) if !path_text(line, token).0.is_empty() => self.include(line, token, None),
            _ => self.tell_no_path(line),
        }
    }

    /// `lib-line = ".lib" path [section]`; a section's own beginning never comes here
    pub(super) fn lib_line(&mut self, line: &Line<'_>) {
        let section = line.word(2).map(|t| unquoted(line.str(t)).to_owned());
        match line.word(1) {
            Some(token) if !path_text(line, token).0.is_empty() => self.include(line, token, section),
            _ => self.tell_no_path(line),
        }
    }

    fn tell_no_path(&mut self, line: &Line<'_>) {
        self.parsed.incomplete = true;
        let finding = Finding::new(
            "unreadable-line",
            Severity::Error,
            line.span,
            format!("{} names no file", line.word_str(0)),
        )
        .label("no file")
        .help("Write the file's path behind it.");
        self.tell(finding);
    }

    fn include(&mut self, line: &Line<'_>, token: Token, section: Option<String>) {
        let written = path_text(line, token);
        let span =
            Span::new(line.file(), line.at(token).start as usize, line.at(token).start as usize + written.1);
        let wanted = PathBuf::from(written.0.replace('\\', "/"));
        let (shown, path) = match self.find(line.file(), wanted) {
            Found::At(shown, path) => (shown, path),
            Found::Outside => return self.tell_outside(span, written.0),
            Found::Nowhere => return self.tell_not_found(span, written.0),
        };
        // a file without sections is the same whatever section of it is asked for
        let is_open = |o: &Opened| o.path == path && (o.is_plain || o.section == section);
        if self.stack.iter().any(is_open) {
            return self.tell_cycle(span, written.0);
        }
        if self.stack.len() >= DEEPEST || self.parsed.includes.len() >= MOST_FILES {
            return self.tell_too_deep(span);
        }
        match load(self.loader, &shown) {
            Ok((bytes, _)) if self.bytes.saturating_add(bytes.len()) > MOST_BYTES => self.tell_too_much(span),
            Ok((bytes, length)) => {
                self.stack.push(Opened { path, section: section.clone(), is_plain: false });
                let fields = std::mem::take(&mut self.fields);
                self.file(&shown, bytes, length, Some(line.span), section.as_deref());
                self.fields = fields;
                self.stack.pop();
            }
            Err(problem) => self.tell_unreadable(span, written.0, &problem.0),
        }
    }

    /// Beside the including file, then in the further places. Each place is asked once: files may name each other
    /// very often.
    fn find(&mut self, file: FileId, wanted: PathBuf) -> Found {
        let beside = Path::new(self.sources.name(file)).parent().unwrap_or(Path::new(""));
        let key = (beside.to_owned(), wanted);
        if let Some(known) = self.found.get(&key) {
            return known.clone();
        }
        let found = self.look_for(&key.0, &key.1);
        self.found.insert(key, found.clone());
        found
    }

    fn look_for(&self, beside: &Path, wanted: &Path) -> Found {
        let mut outside = false;
        for place in std::iter::once(beside).chain(self.options.include_dirs.iter().map(PathBuf::as_path)) {
            let path = place.join(wanted);
            if !self.is_allowed(&path) {
                outside = true;
            } else if self.loader.exists(&path) {
                let resolved = self.loader.resolve(&path);
                return Found::At(path, resolved);
            }
        }
        if outside { Found::Outside } else { Found::Nowhere }
    }

    /// Whether a file may be opened: below the root's repository or directory, or a place named by the user.
    fn is_allowed(&self, path: &Path) -> bool {
        let path = self.loader.resolve(path);
        let escapes = |p: &Path| p.is_absolute() || p.components().any(|c| c == Component::ParentDir);
        let below = |place: &Path| {
            if place.as_os_str().is_empty() { !escapes(&path) } else { path.starts_with(place) }
        };
        below(&self.boundary) || self.options.include_dirs.iter().any(|d| below(&self.loader.resolve(d)))
    }

    fn missing(&mut self, finding: Finding) {
        self.parsed.incomplete = true;
        self.parsed.include_missing = true;
        self.tell(finding);
    }

    fn tell_not_found(&mut self, span: Span, path: &str) {
        let finding = Finding::new("include-not-found", Severity::Error, span, format!("the file {path} is not there"))
            .label("not found beside this file nor in the include directories")
            .about(path)
            .help("Correct the path, or name its place with --include-dir; models and subcircuits that it may define are not reported one by one.");
        self.missing(finding);
    }

    fn tell_outside(&mut self, span: Span, path: &str) {
        let finding = Finding::new("include-outside", Severity::Error, span, format!("the file {path} lies outside the places that may be opened"))
            .label("not opened")
            .about(path)
            .help("Only files of the netlist's own repository or directory are opened; name its place with --include-dir to allow it.");
        self.missing(finding);
    }

    fn tell_unreadable(&mut self, span: Span, path: &str, why: &str) {
        let finding = Finding::new(
            "include-not-found",
            Severity::Error,
            span,
            format!("the file {path} cannot be read: {why}"),
        )
        .label("not read")
        .about(path)
        .help("Models and subcircuits that it may define are not reported one by one.");
        self.missing(finding);
    }

    fn tell_cycle(&mut self, span: Span, path: &str) {
        self.parsed.incomplete = true;
        let finding = Finding::new(
            "include-cycle",
            Severity::Error,
            span,
            format!("the file {path} is being read already, so it includes itself"),
        )
        .label("not read again")
        .about(path)
        .help("Remove this line, or the one that leads here.");
        self.tell(finding);
    }

    fn tell_too_deep(&mut self, span: Span) {
        let (depth, files) = (self.stack.len(), self.parsed.includes.len());
        let message = format!(
            "{files} files are open or read, {depth} within each other; at most {MOST_FILES} and {DEEPEST} are"
        );
        let finding = Finding::new("limit-reached", Severity::Error, span, message)
            .label("not read")
            .help("Include fewer files, or check the parts one by one.");
        self.missing(finding);
    }

    fn tell_too_much(&mut self, span: Span) {
        let message = format!("with this file more than {MOST_BYTES} bytes would be read");
        let finding = Finding::new("limit-reached", Severity::Error, span, message)
            .label("not read")
            .help("Include less, or check the parts one by one.");
        self.missing(finding);
    }

    /// The lines to read: those of the section asked for, or all that stand in none.
    pub(super) fn section(
        &mut self,
        file: FileId,
        lines: Vec<Cut>,
        wanted: Option<&str>,
        from: Option<Span>,
    ) -> Vec<Cut> {
        let text = self.sources.get(file).map_or("", |f| f.text.as_str());
        let sections = sections(text, &lines);
        if let Some(opened) = self.stack.last_mut() {
            opened.is_plain = sections.is_empty();
        }
        if sections.is_empty() && wanted.is_none() {
            return lines;
        }
        let Some(name) = wanted else {
            let inside = |n: usize| sections.iter().any(|s| (s.1..=s.2).contains(&n));
            return lines.into_iter().enumerate().filter(|(n, _)| !inside(*n)).map(|(_, l)| l).collect();
        };
        if let Some(section) = sections.iter().find(|s| s.0.eq_ignore_ascii_case(name)) {
            return lines.get(section.1 + 1..section.2).unwrap_or_default().to_vec();
        }
        if sections.is_empty() {
            // a plain file: all of it is meant
            return lines;
        }
        let names: Vec<String> = sections.iter().map(|s| s.0.to_owned()).collect();
        let path = self.sources.name(file).to_owned();
        let span = from.unwrap_or(Span::new(file, 0, 0));
        let finding = Finding::new(
            "include-not-found",
            Severity::Error,
            span,
            format!("the file {path} has no section {name}"),
        )
        .label("nothing read")
        .about(name)
        .help(match nearest(name, names.iter().map(String::as_str)) {
            Some(near) => format!("Did you mean `{near}`?"),
            None => format!("It has {}.", crate::finding::list(&names, 8)),
        });
        self.missing(finding);
        Vec::new()
    }
}

/// Sections of a library: name, number of the `.lib` line, number of the `.endl` line.
fn sections<'t>(text: &'t str, lines: &[Cut]) -> Vec<(&'t str, usize, usize)> {
    let mut out = Vec::new();
    let mut open: Option<(&str, usize)> = None;
    for (number, line) in lines.iter().enumerate().filter(|(_, l)| l.kind == LineKind::Dot) {
        let statement = text.get(line.start as usize..line.end as usize).unwrap_or("");
        let statement = statement.split(';').next().unwrap_or("");
        let mut words = statement.split_whitespace();
        let word = words.next().unwrap_or("");
        if word.eq_ignore_ascii_case(".lib") {
            let words: Vec<&str> = words.take_while(|w| !w.starts_with('$')).collect();
            if let ([name], None) = (words.as_slice(), open) {
                open = Some((unquoted(name), number));
            } else if let [name] = words.as_slice() {
                // the one before was an include
                open = Some((unquoted(name), number));
            }
        } else if word.eq_ignore_ascii_case(".endl")
            && let Some((name, start)) = open.take()
        {
            out.push((name, start, number));
        }
    }
    out
}

fn unquoted(text: &str) -> &str {
    text.trim_matches(['"', '\''])
}

/// The path as written, without quotes, and the bytes it takes with them. Unquoted it runs to the next blank.
fn path_text<'t>(line: &Line<'t>, token: Token) -> (&'t str, usize) {
    let rest = line.text.get(token.start as usize..).unwrap_or("");
    let quote = rest.chars().next().filter(|c| matches!(c, '"' | '\''));
    let taken = match quote {
        Some(_) => (token.end - token.start) as usize,
        None => rest.find(|c: char| c.is_whitespace() || c == ';').unwrap_or(rest.len()),
    };
    (unquoted(rest.get(..taken).unwrap_or("")), taken)
}
