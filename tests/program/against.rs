//! `check --against OLD`: an old repository gates on what is new only.

use crate::runner::{run, run_in, scratch};
use std::path::PathBuf;

const OLD: &str = "lamp\nV1 a 0 5\nR1 a 0 1M\n";
const NEW: &str = "lamp\n* moved down\n\nV1 a 0 5\nR1 a 0 1M\nR2 a 0 2M\n";

fn folder(name: &str) -> PathBuf {
    let folder = scratch(&format!("against-{name}"));
    for side in ["old", "new"] {
        std::fs::create_dir_all(folder.join(side).join("deep")).unwrap();
    }
    std::fs::write(folder.join("old/deep/a.net"), OLD).unwrap();
    std::fs::write(folder.join("new/deep/a.net"), NEW).unwrap();
    folder
}

#[test]
fn a_file_a_directory_and_saved_findings_will_do() {
    let folder = folder("kinds");
    let saved = run_in(&folder, &["check", "old", "--format", "json"]).out.replace("old/", "new/");
    std::fs::write(folder.join("saved.json"), saved).unwrap();
    for arguments in [
        &["check", "new/deep/a.net", "--against", "old/deep/a.net"][..],
        &["check", "new", "--against", "old"],
        &["check", "new", "--against", "saved.json"],
        &["check", "new/deep/a.net", "--against", "saved.json"],
    ] {
        let run = run_in(&folder, arguments);
        assert_eq!(run.code, 1, "{arguments:?}: {}{}", run.out, run.err);
        assert!(run.out.contains("R2 is") && !run.out.contains("R1 is"), "{arguments:?}: {}", run.out);
        assert!(run.out.contains("(1 known before)"), "{arguments:?}: {}", run.out);
    }
}

#[test]
fn nothing_new_ends_with_0_and_a_new_file_is_all_new() {
    let folder = folder("clean");
    std::fs::write(folder.join("new/deep/a.net"), format!("{OLD}* a comment\n")).unwrap();
    assert_eq!(run_in(&folder, &["check", "new", "--against", "old"]).code, 0);
    std::fs::write(folder.join("new/b.net"), OLD).unwrap();
    let run = run_in(&folder, &["check", "new", "--against", "old"]);
    assert_eq!(run.code, 1);
    assert!(run.out.contains("new/b.net:3:"), "{}", run.out);
}

#[test]
fn the_json_counts_what_was_known() {
    let folder = folder("json");
    let run = run_in(&folder, &["check", "new", "--against", "old", "--format", "json"]);
    let document: serde_json::Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(document["findings"].as_array().unwrap().len(), 1);
    assert_eq!((&document["summary"]["known"], &document["summary"]["warnings"]), (&1.into(), &1.into()));
}

#[test]
fn what_is_no_longer_accepted_is_new() {
    let folder = folder("accepted");
    let note = "*@ accept misread-value R1 because it is a shunt\n";
    std::fs::write(folder.join("old/deep/a.net"), format!("{OLD}{note}")).unwrap();
    std::fs::write(folder.join("new/deep/a.net"), OLD).unwrap();
    assert_eq!(run_in(&folder, &["check", "new", "--against", "old"]).code, 1);
}

#[test]
fn what_cannot_be_compared_with_is_told() {
    let folder = folder("wrong");
    std::fs::write(folder.join("other.json"), "{\"format\":\"kneewise.states\",\"findings\":[]}").unwrap();
    for old in ["missing", "other.json", "missing.json"] {
        let run = run_in(&folder, &["check", "new", "--against", old]);
        assert_eq!((run.code, run.out.as_str()), (2, ""), "{old}");
        assert!(run.err.contains(old), "{}", run.err);
    }
    assert_eq!(run(&["check", "fixtures", "README.md", "--against", "fixtures"]).code, 2);
}
