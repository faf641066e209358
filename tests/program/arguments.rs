//! Arguments and exit codes: 0 clean, 1 something at or above `--fail-on`, 2 the job could not be done.

use crate::runner::{feed, run, run_in, scratch};

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

#[test]
fn an_instant_that_meets_an_inductor_judges_nothing() {
    // a transformer across an alternating source, and a converter whose switch is held on: good circuits
    let mains = "Bench supply\nV1 p 0 SIN(0 17 50)\nL1 p 0 1\nL2 s 0 10m\nK1 L1 L2 0.99\nD1 s o DR\nR1 o 0 1k\n\
                 .model DR D(IS=1n)\n";
    let boost = "Beacon supply\nV1 in 0 5\nL1 in sw 10u\nM1 sw g 0 0 MN\nRG g 0 10k\nD1 sw out DR\nR1 out 0 1k\n\
                 *@ hold M1 both\n.model MN NMOS(VTO=2)\n.model DR D(IS=1n)\n";
    for circuit in [mains, boost] {
        for command in ["check", "states"] {
            let run = feed(&[command, "-"], circuit);
            assert_eq!(run.code, 0, "{}{}", run.out, run.err);
        }
    }
    let shorted = "Bench supply\nV1 p 0 17\nL1 p 0 1\nD1 p o DR\nR1 o 0 1k\n.model DR D(IS=1n)\n";
    assert_eq!(feed(&["states", "-"], shorted).code, 1);
}

#[test]
fn an_amplifier_whose_input_is_zero_proves() {
    // a macro model as vendors publish them: a follower between clamps, with nothing at its input
    let circuit = "Sensor clamp\nVP p 0 15\nVN n 0 -15\nVS in 0 0\nR1 in a 10k\nR2 a b 10k\nRIN b out 1T\n\
                   E1 x 0 b out 200k\nR3 x y 1k\nE2 z 0 y 0 1\nR4 z out 75\nD1 b p DC\nD2 n b DC\n.model DC D\n";
    let run = feed(&["states", "-"], circuit);
    assert_eq!(run.code, 0, "{}{}", run.out, run.err);
}

#[test]
fn names_of_schematic_editors_are_nodes() {
    let circuit = "Beacon\nV1 +12V GND 12\nR1 +12V Net-(D1-A) 1k\nD1 Net-(D1-A) /~{EN} DL\nR2 /~{EN} GND 4k7\n\
                   .model DL D(IS=1e-20 N=1.8)\n";
    let run = feed(&["check", "-"], circuit);
    assert_eq!(run.code, 0, "{}", run.out);
    assert!(feed(&["states", "-", "--format", "json"], circuit).out.contains(r#""name":"Net-(D1-A)""#));
}

#[test]
fn an_include_that_is_missing_is_not_called_outside() {
    let folder = scratch("missing-include");
    let netlist = folder.join("board.net");
    let text = "Board\n.include parts/diodes.lib\n.include /nowhere/diodes.lib\nV1 a 0 5\nR1 a 0 1k\n";
    std::fs::write(&netlist, text).unwrap();
    let run = run(&["check", netlist.to_str().unwrap()]);
    assert!(run.out.contains("include-not-found"), "{}", run.out);
    assert!(run.out.contains("include-outside"), "{}", run.out);
}

#[test]
fn what_an_option_brings_about_is_told_by_the_same_option() {
    let run = feed(&["states", "-", "--set", "VX=3"], CLEAN);
    assert!(run.err.contains("`kneewise check - --set VX=3`"), "{}", run.err);
}

#[test]
fn diodes_are_counted_where_nothing_could_be_solved() {
    let circuit =
        "Clipper\nR1 in m 10k\nR3 in 0 1k\nX1 m 0 out NOSUCH\nD1 m out DC\nD2 out m DC\n.model DC D\n";
    let run = feed(&["states", "-"], circuit);
    assert!(run.out.contains("2 diodes: 2 not evaluated; 1 condition"), "{}", run.out);
    assert_eq!(run.out.matches("X1 is not modelled").count(), 1, "{}", run.out);
    let json = feed(&["states", "-", "--format", "json"], circuit).out;
    assert_eq!(json.matches("X1 is not modelled").count(), 1, "{json}");
}

#[test]
fn a_watched_node_that_is_not_there_is_told() {
    let run = feed(&["check", "-"], &CLEAN.replace(".end", "*@ watch led\n*@ watch led lde\n.end"));
    assert_eq!(run.out.matches("unknown-name").count(), 1, "{}", run.out);
    assert!(run.out.contains("no node here is named `lde`"), "{}", run.out);
}

#[test]
fn troubles_with_files_are_told_in_plain_words() {
    let folder = scratch("troubles");
    std::fs::write(folder.join("a.net"), CLEAN).unwrap();
    std::fs::write(folder.join("latin.json"), b"\xff\xfe\xfd").unwrap();
    for (arguments, words) in [
        (&["check", "gone.net"][..], "gone.net: there is no such file"),
        (&["states", "."], ".: it is a directory"),
        (&["swing", "gone.net"], "gone.net: there is no such file"),
        (&["annotate", "."], ".: it is a directory, which can only be written or verified"),
        (&["compare", "a.net", "gone.net"], "gone.net: there is no such file"),
        (&["check", "a.net/b.net"], "a.net/b.net: a part of its path is a file and no directory"),
        (&["check", ".", "--against", "a.net"], "a.net: it is a file, and . is a directory"),
        (&["check", "a.net", "--config", "gone.toml"], "gone.toml: there is no such file"),
        (&["check", "a.net", "--against", "latin.json"], "latin.json: it is no text in UTF-8"),
        (
            &["swing", "a.net", "--plot", "gone/a.svg"],
            "gone/a.svg: the picture could not be written: its directory",
        ),
    ] {
        let run = run_in(&folder, arguments);
        assert_eq!(run.code, 2, "{arguments:?}");
        assert!(run.err.starts_with(&format!("kneewise: {words}")), "{arguments:?}: {}", run.err);
        assert!(!run.err.contains("os error"), "{arguments:?}: {}", run.err);
    }
}

#[test]
fn a_source_that_is_not_there_is_named_where_the_states_are_shown() {
    for command in ["states", "swing"] {
        let run = feed(&[command, "-", "--set", "VIM=3"], CLEAN);
        assert_eq!(run.code, 1, "{command}");
        assert!(run.err.contains("`--set VIM=…` names no source of this circuit"), "{command}: {}", run.err);
    }
    let run = feed(&["check", "-", "--set", "V2=3"], CLEAN);
    assert!(run.out.contains("Did you mean `V1`?"), "{}", run.out);
    let run = feed(&["annotate", "-", "--set", "V2=3"], CLEAN);
    assert_eq!((run.code, run.out.as_str()), (2, ""), "{}", run.err);
    assert!(run.err.contains("`--set V2=…` names no source"), "{}", run.err);
    let folder = scratch("set-nowhere");
    for name in ["a.net", "b.net"] {
        std::fs::write(folder.join(name), CLEAN).unwrap();
    }
    let run = run_in(&folder, &["compare", "a.net", "b.net", "--set", "V2=3"]);
    assert_eq!((run.code, run.out.as_str()), (2, ""), "{}", run.err);
    assert!(run.err.contains("`--set V2=…` names no source"), "{}", run.err);
}

#[test]
fn a_negative_drop_is_refused_for_what_it_is() {
    for arguments in [&["states", "-", "--drop", "-1"][..], &["states", "-", "--drop=-1"]] {
        let run = run(arguments);
        assert_eq!(run.code, 2);
        assert!(run.err.contains("it cannot be negative") && !run.err.contains("tip:"), "{}", run.err);
    }
}

#[test]
fn compare_asks_for_both_sides() {
    for arguments in [&["compare"][..], &["compare", "a.net"]] {
        let run = run(arguments);
        assert_eq!(run.code, 2);
        assert!(run.err.contains("<NEW>") && !run.err.contains("[NEW]"), "{}", run.err);
        assert!(run.err.contains("Usage: kneewise compare [OPTIONS] <OLD> <NEW>"), "{}", run.err);
    }
    let help = run(&["compare", "--help"]);
    assert!(!help.out.contains("[NEW]") && !help.out.contains("REST"), "{}", help.out);
}

#[test]
fn nothing_to_show_is_said_and_not_announced() {
    let library = "Parts of the board\n.model DX D\n.subckt A p n\nR1 p n 1k\n.ends\n";
    let run = feed(&["swing", "-"], library);
    assert_eq!(
        run.out,
        "No source moves, so nothing happens over time; there is no diode whose current could move.\n\n"
    );
    let run = feed(&["check", "-"], "");
    assert!(run.out.contains("this file is empty") && !run.out.contains("defined here"), "{}", run.out);
}

#[test]
fn currents_that_no_board_shows_are_told_as_that() {
    let reverse = "t\nV1 a 0 5\nR1 a b 1k\nD1 0 b DX\n.model DX D(IS=1e-15)\n.end\n";
    let run = feed(&["states", "-"], reverse);
    assert!(run.out.contains("< 1 pA") && !run.out.contains("fA"), "{}", run.out);
    let run = feed(&["states", "-", "--why", "D1"], reverse);
    assert!(run.out.contains("under 1 pA"), "{}", run.out);
}

#[test]
fn what_names_no_model_is_told_apart_from_models_that_are_missing() {
    let text = "t\nV1 a 0 5\nR1 a b 1k\nD1 b 0\nD2 b 0 DNONE\n.end\n";
    let run = feed(&["check", "-"], text);
    let words = "the model DNONE is not defined; D1 names no model, so nothing is known about it";
    assert!(run.out.split_whitespace().collect::<Vec<_>>().join(" ").contains(words), "{}", run.out);
}

#[test]
fn what_was_meant_is_proposed() {
    for (arguments, words) in [
        (&["states", "-", "--why", "R1"][..], "R1 in - is no diode"),
        (&["states", "-", "--why", "D2"], "did you mean `D1`?"),
        (&["annotate", "-", "--set", "R1=3"], "R1 is no source"),
        (&["rules", "never"], "did you mean one of"),
        (&["compare", "-", "-"], "standard input can be one side"),
        (&["check", "-", "--include-dir", "no-such-dir"], "no-such-dir: there is no such directory"),
    ] {
        let run = feed(arguments, CLEAN);
        assert_eq!((run.code, run.out.as_str()), (2, ""), "{arguments:?}");
        assert!(run.err.contains(words), "{arguments:?}: {}", run.err);
    }
    assert!(run(&["help", "check"]).out.contains("Usage: kneewise check"));
}

#[test]
fn one_file_under_two_names_is_examined_once() {
    let folder = scratch("twice-named");
    std::fs::write(folder.join("a.net"), CLEAN).unwrap();
    let run = run_in(&folder, &["check", "a.net", "./a.net", "."]);
    assert!(run.out.starts_with("1 file, "), "{}", run.out);
}

#[test]
fn a_file_without_elements_has_no_states() {
    let run = feed(&["states", "-"], "");
    assert_eq!(run.out, "There are no elements in this file, so there are no states.\n");
}

#[test]
fn a_diode_inside_of_instances_is_named_by_its_paths() {
    let lamps = "t\nV1 in 0 5\nXA in S\nXB in S\n.subckt S p\nR1 p m 1k\nD1 m 0 DX\n.ends\n.model DX D\n";
    let run = feed(&["states", "-", "--why", "D1"], lamps);
    assert!(run.err.contains("write its path, such as XA:D1, XB:D1"), "{}", run.err);
}

#[test]
fn conditions_that_are_all_alike_are_not_listed() {
    let ranged = CLEAN.replace(".end", "*@ range V1 4 6\n*@ range temp -10 50\n.end");
    let run = feed(&["states", "-"], &ranged);
    assert!(run.out.contains("unique in all 9 conditions"), "{}", run.out);
    let run = feed(&["states", "-", "--why", "D1"], &ranged);
    assert!(run.out.contains("D1 is conducting in all 9 conditions"), "{}", run.out);
}
