//! Arbitrary bytes as a root file, which may include itself: reading never panics, and every place that a finding
//! names lies inside its file, on character boundaries.
#![no_main]

use kneewise::circuit;
use kneewise::config::Options;
use kneewise::finding::Finding;
use kneewise::text::{Memory, Sources, Span};
use libfuzzer_sys::fuzz_target;
use std::path::Path;

fn holds(sources: &Sources, span: Span) {
    let file = sources.get(span.file).expect("a span names a file that was read");
    assert!(file.text.get(span.range()).is_some(), "{span:?} of {} bytes", file.text.len());
}

fn spans(finding: &Finding) -> Vec<Span> {
    let edits = finding.fix.iter().flat_map(|f| &f.edits).map(|e| e.span);
    let labels = finding.labels.iter().map(|l| l.span);
    let trail = finding.trail.iter().map(|t| t.span);
    std::iter::once(finding.span).chain(edits).chain(labels).chain(trail).collect()
}

fuzz_target!(|bytes: &[u8]| {
    let mut files = Memory::with("a.net", bytes);
    let reading =
        circuit::read(&mut files, Path::new("a.net"), &Options::default()).expect("it is in memory");
    for span in reading.findings.iter().flat_map(spans) {
        holds(&reading.sources, span);
    }
    for (id, element) in reading.circuit.elements() {
        holds(&reading.sources, element.statement);
        holds(&reading.sources, element.name_span);
        for pin in reading.circuit.pins(id) {
            holds(&reading.sources, pin.span);
        }
    }
});
