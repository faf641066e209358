//! A finding leads from the root file to its place: the includes, then the instances, outermost first.

use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::text::Memory;
use std::path::Path;

#[test]
fn a_finding_of_the_wiring_tells_the_includes_and_the_instances() {
    let mut files = Memory::with("root.net", "buoy\n.include all.inc\nV1 a 0 5\nX1 a 0 OUTER\n");
    files.insert("all.inc", ".include parts.inc\nR9 a spare 1k\n");
    files.insert(
        "parts.inc",
        ".subckt OUTER p q\nX2 p q INNER\n.ends\n.subckt INNER p q\nR1 p q 1k\nR2 p open 1k\n.ends\n",
    );
    let analysis = analyse(&mut files, Path::new("root.net"), &Options::default()).unwrap();
    let steps = |subject: &str| {
        let found = analysis.findings.iter().find(|f| f.subjects.iter().any(|s| s == subject));
        let trail = &found.unwrap_or_else(|| panic!("nothing about {subject}")).trail;
        let step = |s: &kneewise::finding::TrailStep| {
            let line = analysis.sources.positions(s.span).0.line;
            format!("{} {}:{line}", s.what, analysis.sources.name(s.span.file))
        };
        trail.iter().map(step).collect::<Vec<_>>()
    };
    assert_eq!(steps("R9"), ["included here root.net:2"]);
    assert_eq!(
        steps("X1:X2:R2"),
        [
            "included here root.net:2",
            "included here all.inc:1",
            "instance X1 of OUTER root.net:4",
            "instance X2 of INNER parts.inc:2"
        ]
    );
}
