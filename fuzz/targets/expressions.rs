//! Arbitrary text as an expression, read and evaluated: no panic, no endless work, and what is wrong is shown inside
//! the text.
#![no_main]

use kneewise::circuit;
use kneewise::config::Options;
use kneewise::syntax;
use kneewise::text::Memory;
use libfuzzer_sys::fuzz_target;
use std::path::Path;

fuzz_target!(|text: &str| {
    if let Err(problem) = syntax::expression(text) {
        assert!(problem.at <= text.len(), "{problem:?}");
    }
    let line = text.replace(['\n', '\r'], " ");
    let file = format!(
        "t\n.param a=2 b={{a+1}} c={{{line}}}\n.func f(x,y) {{{line}}}\nR1 a 0 {{{line}}}\nR2 a 0 {{f(c,1)}}\n"
    );
    let mut files = Memory::with("a.net", file);
    let reading =
        circuit::read(&mut files, Path::new("a.net"), &Options::default()).expect("it is in memory");
    for finding in &reading.findings {
        let file = reading.sources.get(finding.span.file).expect("a span names a file that was read");
        assert!(file.text.get(finding.span.range()).is_some(), "{:?}", finding.span);
    }
});
