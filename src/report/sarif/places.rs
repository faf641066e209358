//! Files and regions as SARIF names them: URI references (RFC 3986) numbered in one list, lines and columns from 1,
//! columns in code points.

use super::shape::{Artifact, ArtifactLocation, Location, PhysicalLocation, Region, Text};
use crate::text::{Encoding, Sources, Span};
use std::collections::BTreeMap;

/// The files of a run, each once.
#[derive(Default)]
pub(super) struct Places {
    artifacts: Vec<Artifact>,
    numbers: BTreeMap<String, usize>,
}

impl Places {
    pub fn finish(self) -> Vec<Artifact> {
        self.artifacts
    }

    pub fn artifact(&mut self, sources: &Sources, span: Span) -> ArtifactLocation {
        let uri = uri(sources.name(span.file));
        let next = self.artifacts.len();
        let index = *self.numbers.entry(uri.clone()).or_insert(next);
        let location = ArtifactLocation { uri, index };
        if index == next {
            let encoding = match sources.get(span.file).map(|f| f.encoding) {
                Some(Encoding::Utf16Le) => "UTF-16LE",
                Some(Encoding::Utf16Be) => "UTF-16BE",
                Some(Encoding::Latin1) => "ISO-8859-1",
                _ => "UTF-8",
            };
            self.artifacts.push(Artifact { location: location.clone(), encoding });
        }
        location
    }

    pub fn location<'a>(&mut self, sources: &Sources, span: Span, message: Option<&'a str>) -> Location<'a> {
        let is_nowhere = sources.get(span.file).is_none_or(|f| f.text.is_empty());
        Location {
            id: None,
            physical_location: PhysicalLocation {
                artifact_location: self.artifact(sources, span),
                region: (!is_nowhere).then(|| region(sources, span)),
            },
            logical_locations: Vec::new(),
            message: message.map(Text::message),
        }
    }
}

pub(super) fn region(sources: &Sources, span: Span) -> Region {
    let (start, end) = sources.positions(span);
    Region { start_line: start.line, start_column: start.column, end_line: end.line, end_column: end.column }
}

/// A path as a URI reference: relative paths stay so, absolute ones become `file:` URIs.
fn uri(path: &str) -> String {
    let path = path.replace('\\', "/");
    let mut out = String::new();
    let is_drive = path.as_bytes().get(1) == Some(&b':');
    if path.starts_with('/') {
        out.push_str("file://");
    } else if is_drive {
        out.push_str("file:///");
    }
    let relative = path.strip_prefix("./").unwrap_or(&path);
    for byte in relative.bytes() {
        match byte {
            b'A'..=b'Z' | b'a'..=b'z' | b'0'..=b'9' | b'-' | b'.' | b'_' | b'~' | b'/' => {
                out.push(char::from(byte));
            }
            b':' if is_drive => out.push(':'),
            other => out.push_str(&format!("%{other:02X}")),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paths_become_references() {
        assert_eq!(uri("boards/a.net"), "boards/a.net");
        assert_eq!(uri("./a b#1.net"), "a%20b%231.net");
        assert_eq!(uri("/tmp/größe.net"), "file:///tmp/gr%C3%B6%C3%9Fe.net");
        assert_eq!(uri("C:\\boards\\a.net"), "file:///C:/boards/a.net");
        assert_eq!(uri("-"), "-");
    }
}
