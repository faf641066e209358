//! `kneewise.toml`, directories, ignore files, and many files at once.

use crate::runner::{run_in, scratch};
use serde_json::Value;
use std::path::{Path, PathBuf};

const MISREAD: &str = "lamp\nV1 a 0 5\nR1 a 0 1M\n";

fn folder(name: &str, files: &[(&str, &str)]) -> PathBuf {
    let folder = scratch(&format!("settings-{name}"));
    for (file, text) in files {
        let path = folder.join(file);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, text).unwrap();
    }
    folder
}

fn json(folder: &Path, arguments: &[&str]) -> Value {
    let run = run_in(folder, &[arguments, &["--format", "json"]].concat());
    serde_json::from_str(&run.out).unwrap_or_else(|e| panic!("{e}: {}{}", run.out, run.err))
}

fn files(document: &Value) -> Vec<String> {
    let mut files: Vec<String> = document["findings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|f| f["file"].as_str().unwrap().to_owned())
        .collect();
    files.dedup();
    files
}

#[test]
fn the_nearest_settings_above_a_file_hold() {
    let folder = folder(
        "nearest",
        &[
            ("kneewise.toml", "[levels]\nmisread-value = \"note\"\n"),
            ("a.net", MISREAD),
            ("strict/kneewise.toml", "[levels]\nmisread-value = \"error\"\n"),
            ("strict/deep/b.net", MISREAD),
        ],
    );
    let document = json(&folder, &["check", "."]);
    let levels: Vec<&str> =
        document["findings"].as_array().unwrap().iter().map(|f| f["severity"].as_str().unwrap()).collect();
    assert_eq!(levels, ["note", "error"]);
    assert_eq!(run_in(&folder, &["check", "a.net"]).code, 0);
    assert_eq!(run_in(&folder, &["check", "."]).code, 1);
    assert_eq!(run_in(&folder, &["check", "a.net", "--config", "strict/kneewise.toml"]).code, 1);
    assert_eq!(run_in(&folder, &["check", "a.net", "--config", "missing.toml"]).code, 2);
}

/// One cause gives one finding; where that one is accepted or switched off, what it led to is told.
#[test]
fn what_is_accepted_or_switched_off_hides_nothing_else() {
    let lamp = "lamp\nV1 v5 0 5\nD1 v5 0 DL\n.model DL D(IS=1e-20 N=2)\n";
    let accepted = format!("{lamp}*@ accept forward-across-source D1 because the bench limits it\n");
    let folder = folder(
        "cause",
        &[
            ("a.net", lamp),
            ("b.net", &accepted),
            ("off.toml", "[levels]\nforward-across-source = \"off\"\n"),
            ("none.toml", ""),
        ],
    );
    let rules = |file: &str, settings: &str| {
        let document = json(&folder, &["check", file, "--config", settings]);
        let shown = document["findings"].as_array().unwrap().iter().filter(|f| f["accepted"].is_null());
        shown.map(|f| f["rule"].as_str().unwrap().to_owned()).collect::<Vec<_>>()
    };
    assert_eq!(rules("a.net", "none.toml"), ["forward-across-source"]);
    assert_eq!(rules("b.net", "none.toml"), ["unlimited-current"]);
    assert_eq!(rules("a.net", "off.toml"), ["unlimited-current"]);
    assert_eq!(run_in(&folder, &["check", "b.net", "--fail-on", "error"]).code, 1);
}

#[test]
fn settings_above_a_repository_are_not_its_own() {
    let folder = folder(
        "repository",
        &[
            ("kneewise.toml", "[levels]\nmisread-value = \"off\"\n"),
            ("repo/.git/HEAD", ""),
            ("repo/a.net", MISREAD),
        ],
    );
    assert_eq!(run_in(&folder.join("repo"), &["check", "a.net"]).code, 1);
}

#[test]
fn fail_on_and_include_places_come_from_the_settings() {
    let folder = folder(
        "places",
        &[
            ("kneewise.toml", "fail-on = \"error\"\ninclude-dirs = [\"parts\"]\n"),
            ("parts/lamp.inc", "R1 a 0 1k\n"),
            ("boards/a.net", "lamp\nV1 a 0 5\n.include lamp.inc\nR2 a 0 1M\n"),
        ],
    );
    let run = run_in(&folder, &["check", "boards"]);
    assert_eq!(run.code, 0, "{}", run.out);
    assert!(run.out.contains("misread-value") && !run.out.contains("include-"), "{}", run.out);
    assert_eq!(run_in(&folder, &["check", "boards", "--fail-on", "warning"]).code, 1);
}

#[test]
fn mistakes_in_settings_are_findings_in_every_format() {
    let folder = folder(
        "mistakes",
        &[("kneewise.toml", "fail_on = \"error\"\n"), ("a.net", "t\nV1 a 0 5\nR1 a 0 1k\n")],
    );
    let document = json(&folder, &["check", "a.net"]);
    let finding = &document["findings"][0];
    assert_eq!(finding["rule"], "unknown-setting");
    assert_eq!((&finding["file"], &finding["line"]), (&"kneewise.toml".into(), &1.into()));
    assert_eq!(finding["fix"]["edits"][0]["replacement"], "fail-on");
    assert_eq!(document["summary"]["files"], 1);
    for format in ["text", "sarif", "markdown"] {
        let run = run_in(&folder, &["check", "a.net", "--format", format]);
        assert!(run.code == 1 && run.out.contains("unknown-setting"), "{format}: {}", run.out);
    }
    assert_eq!(run_in(&folder, &["states", "a.net"]).code, 1);
}

#[test]
fn ignore_files_are_obeyed_and_endings_can_be_set() {
    let folder = folder(
        "walk",
        &[
            (".gitignore", "build/\n"),
            (".ignore", "old.net\n"),
            ("a.net", MISREAD),
            ("old.net", MISREAD),
            ("build/b.net", MISREAD),
            ("c.lst", MISREAD),
        ],
    );
    assert_eq!(files(&json(&folder, &["check", "."])), ["./a.net"]);
    std::fs::write(folder.join("kneewise.toml"), "extensions = [\"lst\"]\n").unwrap();
    assert_eq!(files(&json(&folder, &["check", "."])), ["./c.lst"]);
    // what is named is read, whatever it is called
    assert_eq!(files(&json(&folder, &["check", "build/b.net"])), ["build/b.net"]);
}

#[test]
fn an_included_file_is_no_netlist_of_its_own() {
    let folder = folder(
        "included",
        &[
            ("a.net", "lamp\nV1 a 0 5\n.include parts.cir\n"),
            ("b.net", "lamp\nV1 a 0 5\n.include parts.cir\n"),
            ("parts.cir", "R1 a 0 1M\n"),
        ],
    );
    let document = json(&folder, &["check", "."]);
    assert_eq!(document["summary"]["files"], 2);
    // found once, though two netlists include it
    assert_eq!(files(&document), ["./parts.cir"]);
    assert_eq!(document["findings"].as_array().unwrap().len(), 1);
    // two that include each other are not both passed over
    let round = |other: &str| format!("t\nV1 a 0 5\nR1 a 0 1k\n.include {other}\n");
    std::fs::write(folder.join("a.net"), round("b.net")).unwrap();
    std::fs::write(folder.join("b.net"), round("a.net")).unwrap();
    std::fs::remove_file(folder.join("parts.cir")).unwrap();
    assert_eq!(json(&folder, &["check", "."])["summary"]["files"], 1);
}

#[test]
fn many_files_come_out_in_one_order() {
    let names: Vec<String> = (0..60).map(|n| format!("n{n:02}.net")).collect();
    let list: Vec<(&str, &str)> = names.iter().map(|n| (n.as_str(), MISREAD)).collect();
    let folder = folder("many", &list);
    let first = run_in(&folder, &["check", "."]).out;
    for _ in 0..5 {
        assert_eq!(run_in(&folder, &["check", "."]).out, first);
    }
    let found: Vec<String> = files(&json(&folder, &["check", "."]));
    assert_eq!(found, names.iter().map(|n| format!("./{n}")).collect::<Vec<_>>());
}

#[test]
fn settings_that_cannot_be_read_are_told() {
    let folder = folder("unreadable", &[("a.net", "t\nV1 a 0 5\nR1 a 0 1k\n")]);
    // not UTF-8 and no TOML, whoever runs the tests
    std::fs::write(folder.join("kneewise.toml"), b"fail-on = \xFF\xFE\n").unwrap();
    let run = run_in(&folder, &["check", "a.net"]);
    assert_eq!(run.code, 1, "{}", run.out);
    assert!(run.out.contains("error · unreadable-settings · kneewise.toml:1:"), "{}", run.out);
}

#[test]
fn thresholds_move_the_line() {
    // 1 mA at nominal and 101 mA at the end of the range: two decades from the drop's own current
    let board = "lamp\nV1 in 0 1.6\nR1 in a 1k\nD1 a 0 DX\n.model DX D(IS=1n N=1.8)\n*@ range R1 10 1k\n";
    let folder = folder("thresholds", &[("a.net", board)]);
    let found = |folder: &Path| {
        let document = json(folder, &["check", "a.net"]);
        let list = document["findings"].as_array().unwrap().clone();
        list.iter().filter(|f| f["rule"] == "current-beyond-drop").count()
    };
    assert_eq!(found(&folder), 1);
    std::fs::write(folder.join("kneewise.toml"), "[thresholds]\nswing-note = 3\nswing-warning = 4\n")
        .unwrap();
    assert_eq!(found(&folder), 0);
}
