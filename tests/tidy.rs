//! The order of the house, checked on the source text: each layer imports only from layers above it, every
//! module opens with its purpose, and library code does not give up on input.
//! The scan knows just enough Rust for that: comments, strings, nested modules and `use` trees.

#![allow(clippy::unwrap_used)]

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

/// The layers, uppermost first. A layer may import from itself and from those before it.
const LAYERS: [&str; 14] = [
    "text",
    "complementarity",
    "finding",
    "config",
    "syntax",
    "circuit",
    "topology",
    "operating",
    "swing",
    "rules",
    "analysis",
    "review",
    "report",
    // main.rs and cli are the program, not the library: they see `kneewise::…` only
    "cli",
];

fn rank(layer: &str) -> Option<usize> {
    LAYERS.iter().position(|&l| l == layer)
}

/// All `.rs` files below `dir`, sorted.
fn rust_files(dir: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    let mut folders = vec![dir.to_path_buf()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                files.push(path);
            }
        }
    }
    files.sort();
    files
}

/// The text with comments, strings and character literals blanked, line breaks kept.
fn code_only(text: &str) -> String {
    let bytes = text.as_bytes();
    let mut out = String::with_capacity(text.len());
    let mut at = 0;
    while at < bytes.len() {
        let end = skip(bytes, at);
        if end > at {
            out.extend(text.as_bytes()[at..end].iter().map(|&b| if b == b'\n' { '\n' } else { ' ' }));
            at = end;
        } else {
            out.push(if bytes[at].is_ascii() { char::from(bytes[at]) } else { ' ' });
            at += 1;
        }
    }
    out
}

/// End of the comment or literal that starts at `at`; `at` itself where none does.
fn skip(bytes: &[u8], at: usize) -> usize {
    let rest = &bytes[at..];
    let find = |from: usize, what: &[u8]| {
        (from..rest.len()).find(|&i| rest[i..].starts_with(what)).map_or(bytes.len(), |i| at + i + what.len())
    };
    let in_word = at > 0 && (bytes[at - 1].is_ascii_alphanumeric() || bytes[at - 1] == b'_');
    match rest {
        [b'/', b'/', ..] => find(2, b"\n") - 1,
        [b'/', b'*', ..] => find(2, b"*/"),
        [b'r', b'"', ..] if !in_word => find(2, b"\""),
        [b'r', b'#', b'"', ..] if !in_word => find(3, b"\"#"),
        [b'"', ..] => at + closing(rest, b'"'),
        [b'\'', b'\\', ..] => at + closing(rest, b'\''),
        [b'\'', _, b'\'', ..] => at + 3,
        // a character of several bytes; anything else after a quote is a lifetime
        [b'\'', high, ..] if !high.is_ascii() => find(1, b"'"),
        _ => at,
    }
}

/// Length of a literal with escapes that opens and closes with `quote`.
fn closing(rest: &[u8], quote: u8) -> usize {
    let mut i = 1;
    while i < rest.len() && rest[i] != quote {
        i += if rest[i] == b'\\' { 2 } else { 1 };
    }
    (i + 1).min(rest.len())
}

fn line_of(text: &str, at: usize) -> usize {
    text[..at].matches('\n').count() + 1
}

/// First names of what a path prefix (`crate::`) is followed by at `at`: one, or all of a `{…}` tree.
fn first_names(code: &str, at: usize) -> Vec<(String, usize)> {
    let word = |from: usize| -> String {
        code[from..].chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect()
    };
    if !code[at..].starts_with('{') {
        return vec![(word(at), at)];
    }
    let (mut depth, mut names, mut fresh) = (0, Vec::new(), false);
    for (i, c) in code[at..].char_indices() {
        match c {
            '{' => (depth, fresh) = (depth + 1, depth == 0),
            '}' if depth == 1 => break,
            '}' => depth -= 1,
            ',' if depth == 1 => fresh = true,
            c if c.is_whitespace() => {}
            _ if fresh => {
                names.push((word(at + i), at + i));
                fresh = false;
            }
            _ => {}
        }
    }
    names
}

/// Depth of inline modules (`mod tests { … }`) at byte `at`.
fn inline_depth(code: &str, at: usize) -> usize {
    let (mut braces, mut modules, mut head) = (0usize, Vec::new(), String::new());
    for c in code[..at].chars() {
        match c {
            '{' => {
                if head.split_whitespace().any(|w| w == "mod") {
                    modules.push(braces);
                }
                braces += 1;
                head.clear();
            }
            '}' => {
                braces = braces.saturating_sub(1);
                modules.retain(|&m| m < braces);
                head.clear();
            }
            ';' => head.clear(),
            c => head.push(c),
        }
    }
    modules.len()
}

/// Position of every occurrence of `what` that does not stand inside a longer word or path.
fn occurrences<'a>(code: &'a str, what: &'a str) -> impl Iterator<Item = usize> + 'a {
    code.match_indices(what).map(|(at, _)| at).filter(move |&at| {
        !code[..at].ends_with(|c: char| c.is_alphanumeric() || c == '_') && !code[..at].ends_with("::")
    })
}

/// Path of the module that a file holds, from the crate root: `src/report/json.rs` is `report`, `json`.
fn module_path(relative: &Path) -> Vec<String> {
    let mut parts: Vec<String> =
        relative.with_extension("").iter().map(|p| p.to_string_lossy().into_owned()).collect();
    if parts.last().is_some_and(|p| p == "mod" || p == "lib" || p == "main") {
        parts.pop();
    }
    parts
}

/// Wrong imports of one file, as `(line, message)`. `relative` is its path below `src`.
fn wrong_imports(relative: &Path, text: &str) -> Vec<(usize, String)> {
    let module = module_path(relative);
    let Some(layer) = module.first() else { return Vec::new() };
    let code = code_only(text);
    let mut wrong = Vec::new();
    let Some(own) = rank(layer) else {
        return vec![(1, format!("`{layer}` is in no layer; give it its place in tests/tidy.rs"))];
    };
    let allowed = |name: &str| match rank(name) {
        Some(other) if layer == "cli" => other == own,
        Some(other) => other <= own,
        // macros and names that lib.rs re-exports belong to no layer
        None => layer != "cli",
    };
    for at in occurrences(&code, "crate::") {
        for (name, at) in first_names(&code, at + "crate::".len()) {
            if !allowed(&name) {
                let message = format!("`{layer}` must not import `crate::{name}`");
                wrong.push((line_of(&code, at), message));
            }
        }
    }
    for at in occurrences(&code, "super::") {
        let chain = code[at..].split("super::").take_while(|p| p.is_empty()).count();
        let after = at + chain * "super::".len();
        let depth = module.len() + inline_depth(&code, at);
        if chain >= depth {
            for (name, at) in first_names(&code, after) {
                let message = format!("`{layer}` reaches `{name}` through `super`; write `crate::…`");
                wrong.push((line_of(&code, at), message));
            }
        }
    }
    if layer != "cli" {
        for at in occurrences(&code, "kneewise::") {
            wrong.push((line_of(&code, at), "the library names itself `crate`".into()));
        }
    }
    wrong
}

/// Calls that give up, outside of `#[cfg(test)]`, as `(line, message)`.
fn surrenders(text: &str) -> Vec<(usize, String)> {
    let code = code_only(text);
    let end = code.find("#[cfg(test)]").unwrap_or(code.len());
    let code = &code[..end];
    let mut found = Vec::new();
    for what in [".unwrap(", ".expect(", "panic!", "todo!", "unimplemented!", "unreachable!", "process::exit"]
    {
        for (at, _) in code.match_indices(what) {
            let word = what.trim_matches(['.', '(']);
            found.push((line_of(code, at), format!("`{word}` in library code: input must not end the run")));
        }
    }
    found
}

/// Complaints of all files of a folder, one a line.
fn complaints(dir: &Path, judge: impl Fn(&Path, &str) -> Vec<(usize, String)>) -> String {
    let mut out = String::new();
    for path in rust_files(dir) {
        let text = std::fs::read_to_string(&path).unwrap();
        let relative = path.strip_prefix(dir).unwrap();
        for (line, message) in judge(relative, &text) {
            writeln!(out, "src/{}:{line}: {message}", relative.display()).unwrap();
        }
    }
    out
}

fn src() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("src")
}

fn is_program(relative: &Path) -> bool {
    relative.starts_with("cli") || relative == Path::new("main.rs")
}

#[test]
fn layers_import_only_from_layers_above() {
    let wrong = complaints(&src(), wrong_imports);
    assert!(wrong.is_empty(), "\n{wrong}");
}

#[test]
fn every_module_opens_with_its_purpose() {
    let wrong = complaints(&src(), |_, text| match text.starts_with("//! ") {
        true => Vec::new(),
        false => vec![(1, "opens without `//!`".to_owned())],
    });
    assert!(wrong.is_empty(), "\n{wrong}");
}

/// Test modules in files of their own: `tests.rs`, or anything below `tests/`.
fn is_test(path: &Path) -> bool {
    path.components().any(|c| ["tests", "tests.rs"].map(std::ffi::OsStr::new).contains(&c.as_os_str()))
}

#[test]
fn library_code_never_gives_up() {
    let is_exempt = |path: &Path| is_program(path) || is_test(path);
    let wrong = complaints(&src(), |path, text| if is_exempt(path) { Vec::new() } else { surrenders(text) });
    assert!(wrong.is_empty(), "\n{wrong}");
}

#[test]
fn the_scan_finds_what_it_should() {
    let lines = |path: &str, text: &str| -> Vec<usize> {
        wrong_imports(Path::new(path), text).into_iter().map(|(line, _)| line).collect()
    };
    assert_eq!(lines("text/mod.rs", "//! x\nuse crate::finding::Finding;\n"), [2]);
    assert_eq!(lines("rules/a.rs", "use crate::{\n  text::Span,\n  report::{json, states},\n};"), [3]);
    assert_eq!(lines("circuit/a.rs", "fn f() { crate::operating::solve() }"), [1]);
    assert_eq!(lines("circuit/mod.rs", "use super::report;"), [1]);
    assert_eq!(lines("circuit/a.rs", "use super::ids;\nuse super::super::report;"), [2]);
    assert_eq!(lines("circuit/a.rs", "mod tests {\n use super::*;\n use super::super::ids;\n}"), []);
    assert_eq!(lines("circuit/a.rs", "// crate::report\nconst A: &str = \"crate::report::x\";"), []);
    assert_eq!(lines("circuit/a.rs", "const A: char = '\"'; use crate::report;"), [1]);
    assert_eq!(lines("cli/mod.rs", "use crate::cli::args; use kneewise::report;"), []);
    assert_eq!(lines("cli/mod.rs", "use crate::report;"), [1]);
    assert_eq!(lines("helpers/mod.rs", ""), [1]);
    assert_eq!(surrenders("fn f() {\n x.unwrap();\n}\n#[cfg(test)]\nmod t { y.unwrap() }").len(), 1);
}
