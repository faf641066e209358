//! Arbitrary bytes through the whole check, states included: no panic, and both reports can be written.
#![no_main]

use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::text::Memory;
use libfuzzer_sys::fuzz_target;
use std::path::Path;

fuzz_target!(|bytes: &[u8]| {
    let options = Options { states: true, ..Options::default() };
    let mut files = Memory::with("a.net", bytes);
    let analysis = analyse(&mut files, Path::new("a.net"), &options).expect("it is in memory");
    for finding in &analysis.findings {
        let file = analysis.sources.get(finding.span.file).expect("a span names a file that was read");
        assert!(file.text.get(finding.span.range()).is_some(), "{:?}", finding.span);
    }
});
