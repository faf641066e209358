//! Arguments and exit codes: 0 clean, 1 something at or above `--fail-on`, 2 the job could not be done.

use crate::runner::{feed, run, scratch};

const CLEAN: &str = "Sounder supply\nV1 vin 0 5\nR1 vin led 330\nD1 led 0 DLED\n*@ made-of DLED red-led\n\
                     .model DLED D(IS=1e-20 N=1.7)\n.end\n";
const NO_GROUND: &str = "Sounder supply\nV1 vin ret 5\nR1 vin ret 330\n.end\n";

#[test]
fn a_clean_netlist_ends_with_0() {
    let run = feed(&["check", "-"], CLEAN);
    assert_eq!((run.code, run.err.as_str()), (0, ""), "{}", run.out);
    assert_eq!(run.out, "1 file, 3 elements, 1 diode: no errors, no warnings, no notes\n");
}

#[test]
fn a_faulty_netlist_ends_with_1() {
    let run = feed(&["check", "-"], NO_GROUND);
    assert_eq!(run.code, 1);
    assert!(run.out.contains("error · no-ground · -:"), "{}", run.out);
}

#[test]
fn fail_on_moves_the_line() {
    // a mistyped unit is a warning: 1M on a resistor is a milliohm
    let warning = "t\nV1 a 0 5\nR1 a 0 1M\n.end\n";
    assert_eq!(feed(&["check", "-"], warning).code, 1);
    assert_eq!(feed(&["check", "-", "--fail-on", "error"], warning).code, 0);
    assert_eq!(feed(&["check", "-", "--fail-on", "error"], NO_GROUND).code, 1);
}

#[test]
fn what_cannot_be_read_ends_with_2() {
    let run = run(&["check", "no-such-file.net"]);
    assert_eq!((run.code, run.out.as_str()), (2, ""));
    assert!(run.err.starts_with("kneewise: no-such-file.net: "), "{}", run.err);
}

#[test]
fn one_unreadable_file_hides_no_other() {
    let folder = scratch("unreadable");
    let good = folder.join("good.net");
    std::fs::write(&good, NO_GROUND).unwrap();
    let run = run(&["check", "no-such-file.net", good.to_str().unwrap()]);
    assert_eq!(run.code, 2);
    assert!(run.out.contains("no-ground"), "{}", run.out);
}

#[test]
fn wrong_usage_ends_with_2_and_says_so_on_standard_error() {
    for arguments in [
        &["check"][..],
        &["frobnicate"],
        &["check", "a.net", "--format", "xml"],
        &["check", "a.net", "--set", "VIN"],
        &["check", "a.net", "--drop", "-1"],
        &["states", "-", "--why", "D9"],
        &["rules", "no-such-rule"],
    ] {
        let run = run(arguments);
        assert_eq!((run.code, run.out.as_str()), (2, ""), "{arguments:?}");
        assert!(!run.err.is_empty(), "{arguments:?}");
    }
}

#[test]
fn help_is_a_result() {
    let run = run(&["check", "--help"]);
    assert_eq!((run.code, run.err.as_str()), (0, ""));
    assert!(run.out.contains("Examples:"));
}

#[test]
fn a_directory_is_walked_in_order() {
    let folder = scratch("walk");
    std::fs::create_dir_all(folder.join("b")).unwrap();
    std::fs::create_dir_all(folder.join(".hidden")).unwrap();
    for name in ["c.cir", "a.NET", "b/d.ckt", "readme.txt", ".hidden/x.net"] {
        std::fs::write(folder.join(name), NO_GROUND).unwrap();
    }
    let run = run(&["check", folder.to_str().unwrap(), "--format", "json"]);
    let document: serde_json::Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(document["summary"]["files"], 3);
    let mut files: Vec<String> = document["findings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|f| f["file"].as_str().unwrap().rsplit('/').next().unwrap().to_owned())
        .collect();
    files.dedup();
    assert_eq!(files, ["a.NET", "d.ckt", "c.cir"]);
}

#[test]
fn a_directory_without_netlists_is_not_a_clean_bill() {
    let folder = scratch("nothing-here");
    let run = run(&["check", folder.to_str().unwrap()]);
    assert_eq!(run.code, 2);
    assert!(run.err.contains("no netlist"), "{}", run.err);
}

#[test]
fn an_empty_file_is_told_and_does_no_harm() {
    for command in ["check", "states"] {
        let run = feed(&[command, "-"], "");
        assert!(run.code == 0 || run.code == 1, "{}{}", run.out, run.err);
    }
}

#[test]
fn a_contradiction_in_states_is_an_error() {
    // nothing limits the current: 5 V straight across one diode
    let netlist = "t\nV1 a 0 5\nD1 a 0 DX\n.model DX D\n.end\n";
    let run = feed(&["states", "-", "--fail-on", "error"], netlist);
    assert_eq!(run.code, 1, "{}", run.out);
}

#[test]
fn a_source_can_be_set() {
    let run = feed(&["states", "-", "--set", "V1=2k5", "--drop", "650m", "--format", "json"], CLEAN);
    let document: serde_json::Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(document["cases"][0]["sources"]["V1"], 2500.0);
    let diode = &document["cases"][0]["solutions"][0]["diodes"][0];
    assert_eq!(diode["drop_V"], 0.65);
    assert_eq!(diode["drop_origin"], "option");
}
