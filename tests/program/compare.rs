//! `compare`: usage, formats, what counts, and what is no change.

use crate::runner::{root, run_in, scratch};
use serde_json::Value;
use std::path::{Path, PathBuf};

const OLD: &str =
    "lamp\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\nD2 0 a DX\n.model DX D(IS=1n N=1.8)\n*@ range V1 -5 5\n";

fn folder(name: &str, old: &str, new: &str) -> PathBuf {
    let folder = scratch(&format!("compare-{name}"));
    std::fs::write(folder.join("old.net"), old).unwrap();
    std::fs::write(folder.join("new.net"), new).unwrap();
    folder
}

fn json(folder: &Path) -> Value {
    let run = run_in(folder, &["compare", "old.net", "new.net", "--format", "json"]);
    let document: Value = serde_json::from_str(&run.out).unwrap_or_else(|e| panic!("{e} {}", run.err));
    let text = std::fs::read_to_string(root().join("grammar/comparison.schema.json")).unwrap();
    let schema = jsonschema::validator_for(&serde_json::from_str(&text).unwrap()).unwrap();
    let problems: Vec<String> = schema.iter_errors(&document).map(|e| e.to_string()).collect();
    assert!(problems.is_empty(), "{problems:?}");
    document
}

/// How many entries each list has.
fn counts(document: &Value) -> Vec<(&'static str, usize)> {
    let lists = ["states", "currents", "voltages", "wiring", "verdicts", "trust"];
    lists.into_iter().map(|l| (l, document[l].as_array().unwrap().len())).filter(|c| c.1 > 0).collect()
}

#[test]
fn renaming_nodes_and_shuffling_lines_is_no_change() {
    let new = "lamp\n.model DX D(IS=1n N=1.8)\nD2 0 anode DX\nD1 anode gnd DX\n* moved\nR1 anode supply 1k\n\
               V1 supply 0 5\n*@ range V1 -5 5\n";
    let folder = folder("same", OLD, new);
    assert_eq!(counts(&json(&folder)), []);
    let run = run_in(&folder, &["compare", "old.net", "new.net"]);
    assert_eq!((run.code, run.out.as_str()), (0, "electrically nothing differs\n"));
}

#[test]
fn a_flip_counts_as_a_warning_and_says_why() {
    let folder = folder("flip", OLD, &OLD.replace("D1 a 0", "D1 0 a"));
    let document = json(&folder);
    // in nominal and V1=5; at V1=-5 D2, held at the drop of a smaller decade, takes the current as before
    assert_eq!(document["states"].as_array().unwrap().len(), 2);
    let first = &document["states"][0];
    assert_eq!(
        (&first["diode"], &first["old"], &first["new"]),
        (&"D1".into(), &"conducting".into(), &"blocking".into())
    );
    assert!(first["why"].as_str().unwrap().contains("D1"), "{first}");
    assert_eq!(document["wiring"][0]["what"], "is turned round; it now leads from 0 to a");
    let code = |limit: &str| run_in(&folder, &["compare", "old.net", "new.net", "--fail-on", limit]).code;
    assert_eq!((code("warning"), code("error")), (1, 0));
}

#[test]
fn the_edge_of_a_decade_is_no_news() {
    // 3.0 mA and 3.3 mA lie on either side of the edge between 1 mA and 10 mA, 58 mV of drop apart
    let old = "lamp\nV1 in 0 3.6\nR1 in a 1k\nD1 a 0 DX\n.model DX D(IS=1n N=1.8)\n";
    let folder = folder("decade", old, &old.replace("3.6", "4.0"));
    let document = json(&folder);
    let moved: Vec<&str> =
        document["voltages"].as_array().unwrap().iter().map(|v| v["name"].as_str().unwrap()).collect();
    assert_eq!(moved, ["in"], "the drop at a stays");
    // a new model is judged by its own decade
    let other = old.replace("3.6", "4.0").replace("IS=1n", "IS=1.1n");
    std::fs::write(folder.join("new.net"), other).unwrap();
    let moved = json(&folder)["voltages"].as_array().unwrap().len();
    assert_eq!(moved, 2);
}

#[test]
fn what_is_new_gone_renamed_and_rewired_is_told() {
    let new =
        OLD.replace("R1 in a", "R7 in a").replace("D2 0 a DX", "C1 a 0 1u").replace("D1 a 0", "D1 in 0");
    let folder = folder("wiring", OLD, &new);
    let document = json(&folder);
    let told: Vec<String> = document["wiring"]
        .as_array()
        .unwrap()
        .iter()
        .map(|w| format!("{} {}", w["element"].as_str().unwrap(), w["what"].as_str().unwrap()))
        .collect();
    assert_eq!(
        told,
        [
            "R7 was R1",
            "D1 its anode moved from a to in",
            "C1 is new; it joins a to 0",
            "D2 is gone; it joined 0 to a"
        ]
    );
}

#[test]
fn findings_come_and_go() {
    let old = format!("{OLD}R5 a b 1k\n");
    let new = format!("{OLD}R6 in 0 1M\n");
    let folder = folder("findings", &old, &new);
    let document = json(&folder);
    let rules = |which: &str| -> Vec<String> {
        let list = document["findings"][which].as_array().unwrap();
        list.iter().map(|f| f["rule"].as_str().unwrap().to_owned()).collect()
    };
    assert_eq!(
        (rules("new"), rules("gone")),
        (vec!["misread-value".to_owned()], vec!["dangling-node".to_owned()])
    );
}

#[test]
fn wrong_usage_is_told() {
    let folder = folder("usage", OLD, OLD);
    std::fs::create_dir(folder.join("empty")).unwrap();
    for arguments in [
        &["compare", "old.net"][..],
        &["compare", "old.net", "new.net", "old.net"],
        &["compare", "old.net", "empty"],
        &["compare", "empty", "empty"],
        &["compare", "old.net", "missing.net"],
        &["compare", "old.net", "new.net", "--moved", "much"],
    ] {
        let run = run_in(&folder, arguments);
        assert_eq!((run.code, run.out.as_str()), (2, ""), "{arguments:?}");
        assert!(!run.err.is_empty(), "{arguments:?}");
    }
}

#[test]
fn a_whole_instance_is_told_once_and_a_change_inside_a_definition_too() {
    let old = "lamps\nV1 in 0 5\nX1 in S\nX2 in S\nX3 in S\n.subckt S p\nR1 p m 1k\nD1 m 0 DX\n.ends\n.model DX D\n";
    let new = old.replace("X3 in S\n", "").replace("D1 m 0", "D1 0 m");
    let folder = folder("instances", old, &new);
    let document = json(&folder);
    let told: Vec<String> = document["wiring"]
        .as_array()
        .unwrap()
        .iter()
        .map(|w| format!("{} {}", w["element"].as_str().unwrap(), w["what"].as_str().unwrap()))
        .collect();
    assert_eq!(
        told,
        [
            "X1:D1 is turned round; it now leads from 0 to X1:m (the same in 2 instances)",
            "X3 is gone, an instance of S (2 elements)"
        ]
    );
}

#[test]
fn a_part_with_a_memory_is_compared_over_time() {
    let old = "supply\nV1 in 0 SIN(0 20 50)\nD1 in out DX\nR1 out 0 1k\nC1 out 0 100u\n.model DX D\n*@ drop DX 0.7\n";
    let names = |name: &str, new: &str| {
        let document = json(&folder(name, old, new));
        let of = |list: &str, key: &str| -> Vec<String> {
            let list = document[list].as_array().unwrap().iter();
            list.map(|m| format!("{} {}", m[key].as_str().unwrap(), m["case"].as_str().unwrap())).collect()
        };
        (of("states", "diode"), of("currents", "name"), of("voltages", "name"))
    };
    let turned = names("time-turned", &old.replace("D1 in out", "D1 out in"));
    assert_eq!(turned.0, [] as [&str; 0], "it conducts as much as before, the other way");
    assert_eq!(turned.2, ["out over time"]);
    let heavier = names("time-heavier", &old.replace("1k", "500"));
    assert_eq!((heavier.0.len(), heavier.1), (0, vec!["D1 over time".to_owned()]));
}
