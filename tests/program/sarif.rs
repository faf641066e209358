//! SARIF: obeys the published schema, places are right when counted another way, fingerprints survive edits elsewhere,
//! and everything that a finding has is there.

use crate::runner::{root, run, run_in, scratch};
use jsonschema::Validator;
use serde_json::Value;
use std::collections::BTreeMap;

fn schema() -> Validator {
    let text =
        std::fs::read_to_string(root().join("tests/program/published/sarif-2.1.0.schema.json")).unwrap();
    jsonschema::validator_for(&serde_json::from_str(&text).unwrap()).unwrap()
}

fn check(schema: &Validator, text: &str) -> Value {
    let document: Value = serde_json::from_str(text).unwrap();
    let problems: Vec<String> =
        schema.iter_errors(&document).map(|e| format!("{}: {e}", e.instance_path())).collect();
    assert!(problems.is_empty(), "{}", problems.join("\n"));
    document
}

fn results(document: &Value) -> &Vec<Value> {
    document["runs"][0]["results"].as_array().unwrap()
}

/// Every physical location anywhere in the log.
fn locations<'v>(value: &'v Value, out: &mut Vec<&'v Value>) {
    match value {
        Value::Object(map) => {
            out.extend(map.get("physicalLocation"));
            map.values().for_each(|v| locations(v, out));
        }
        Value::Array(list) => list.iter().for_each(|v| locations(v, out)),
        _ => {}
    }
}

const BOARD: &str = "größe µ\n* a comment\nV1 in 0 5\nRµ1 in a 1M ; ÄÖ\nX1 a S\nX2 a S\n.subckt S p\nD1 p m DX\n\
                     R2 m 0 1k\nC1 m tp 1u\n.ends\n.model DX D\n*@ accept dangling-node tp because it is a test pad\n";

#[test]
fn logs_obey_the_published_schema() {
    let schema = schema();
    let folder = scratch("sarif-schema");
    std::fs::write(folder.join("a b#.net"), BOARD).unwrap();
    std::fs::write(folder.join("empty.net"), "").unwrap();
    std::fs::write(folder.join("kneewise.toml"), "[levels]\nmisread-valu = \"off\"\n").unwrap();
    let document = check(&schema, &run_in(&folder, &["check", ".", "--format", "sarif"]).out);
    assert!(results(&document).len() > 3);
    let document = check(&schema, &run(&["check", "fixtures", "--format", "sarif"]).out);
    let used: Vec<&str> = results(&document).iter().map(|r| r["ruleId"].as_str().unwrap()).collect();
    assert!(used.contains(&"diode-state") && used.contains(&"never-conducts"));
    for result in results(&document) {
        let index = result["ruleIndex"].as_u64().unwrap() as usize;
        assert_eq!(document["runs"][0]["tool"]["driver"]["rules"][index]["id"], result["ruleId"]);
    }
}

/// Line and column of a text's place, by cutting the text instead of counting line starts.
fn cut<'t>(text: &'t str, region: &Value) -> &'t str {
    let place = |line: &str, column: &str| {
        let (line, column) =
            (region[line].as_u64().unwrap() as usize, region[column].as_u64().unwrap() as usize);
        let start: usize = text.split_inclusive('\n').take(line - 1).map(str::len).sum();
        start + text[start..].chars().take(column - 1).map(char::len_utf8).sum::<usize>()
    };
    &text[place("startLine", "startColumn")..place("endLine", "endColumn")]
}

#[test]
fn places_are_right_when_counted_another_way() {
    let folder = scratch("sarif-places");
    std::fs::write(folder.join("a.net"), BOARD).unwrap();
    let log = run_in(&folder, &["check", "a.net", "--format", "sarif"]).out;
    let document: Value = serde_json::from_str(&log).unwrap();
    assert_eq!(document["runs"][0]["columnKind"], "unicodeCodePoints");
    let misread = results(&document).iter().find(|r| r["ruleId"] == "misread-value").unwrap();
    assert_eq!(cut(BOARD, &misread["locations"][0]["physicalLocation"]["region"]), "1M");
    let edit = &misread["fixes"][0]["artifactChanges"][0]["replacements"][0];
    assert_eq!(cut(BOARD, &edit["deletedRegion"]), "1M");
    let state = results(&document).iter().find(|r| r["ruleId"] == "diode-state").unwrap();
    assert_eq!(cut(BOARD, &state["locations"][0]["physicalLocation"]["region"]), "D1 p m DX");
    assert_eq!((&state["kind"], &state["level"]), (&"informational".into(), &"none".into()));
    // every place can be cut out
    let mut all = Vec::new();
    locations(&document, &mut all);
    assert!(all.len() > 4, "{}", all.len());
    for place in all.into_iter().filter_map(|p| p.get("region")) {
        let _ = cut(BOARD, place);
    }
}

#[test]
fn what_a_finding_has_is_there() {
    let folder = scratch("sarif-parts");
    std::fs::write(folder.join("a.net"), BOARD).unwrap();
    let log = run_in(&folder, &["check", "a.net", "--format", "sarif"]).out;
    let document: Value = serde_json::from_str(&log).unwrap();
    let dangling = results(&document).iter().find(|r| r["ruleId"] == "dangling-node").unwrap();
    let flow = &dangling["codeFlows"][0]["threadFlows"][0]["locations"];
    let words: Vec<&str> = flow
        .as_array()
        .unwrap()
        .iter()
        .map(|step| step["location"]["message"]["text"].as_str().unwrap())
        .collect();
    assert_eq!(words, ["instance X1 of S", "here"]);
    let accepted = run(&["check", "-", "--format", "sarif"]);
    assert_eq!(accepted.code, 0);
    let rules = document["runs"][0]["tool"]["driver"]["rules"].as_array().unwrap();
    assert!(rules.iter().all(|r| !r["help"]["markdown"].as_str().unwrap().is_empty()));
}

#[test]
fn accepted_findings_are_suppressed_with_their_reason() {
    let folder = scratch("sarif-accepted");
    let board =
        "t\nV1 in 0 5\nR1 in 0 1k\nR2 in tp 1k\n*@ accept dangling-node tp because it is a test pad\n";
    std::fs::write(folder.join("a.net"), board).unwrap();
    let log = run_in(&folder, &["check", "a.net", "--format", "sarif"]).out;
    let document: Value = serde_json::from_str(&log).unwrap();
    let result = &results(&document)[0];
    assert_eq!(result["suppressions"][0]["kind"], "inSource");
    assert_eq!(result["suppressions"][0]["justification"], "it is a test pad");
}

/// Fingerprints by rule, subject and number.
fn fingerprints(log: &str) -> BTreeMap<String, String> {
    let document: Value = serde_json::from_str(log).unwrap();
    let one = |(n, r): (usize, &Value)| {
        let subject = r["properties"]["subjects"][0].as_str().map_or_else(|| n.to_string(), str::to_owned);
        let key = format!("{} {subject}", r["ruleId"].as_str().unwrap());
        (key, r["partialFingerprints"]["kneewise/v1"].as_str().unwrap().to_owned())
    };
    results(&document).iter().enumerate().map(one).collect()
}

#[test]
fn fingerprints_survive_unrelated_edits() {
    let folder = scratch("sarif-fingerprints");
    let sarif = |text: &str| {
        std::fs::write(folder.join("a.net"), text).unwrap();
        fingerprints(&run_in(&folder, &["check", "a.net", "--format", "sarif"]).out)
    };
    let first = sarif(BOARD);
    let moved = BOARD.replace("* a comment", "* a comment\n* and another\n\nR9 in 0 3k3");
    assert_eq!(first, sarif(&moved));
    // and tell findings apart
    let distinct: std::collections::BTreeSet<&String> = first.values().collect();
    assert_eq!(distinct.len(), first.len(), "{first:?}");
}

#[test]
fn a_comparison_tells_which_results_are_new() {
    let folder = scratch("sarif-baseline");
    std::fs::write(folder.join("old.net"), "t\nV1 in 0 5\nR1 in 0 1M\n").unwrap();
    std::fs::write(folder.join("new.net"), "t\nV1 in 0 5\nR1 in 0 1M\nR2 in 0 2M\n").unwrap();
    let run = run_in(&folder, &["check", "new.net", "--against", "old.net", "--format", "sarif"]);
    let document = check(&schema(), &run.out);
    let states: Vec<(&str, &str)> = results(&document)
        .iter()
        .map(|r| (r["properties"]["subjects"][0].as_str().unwrap(), r["baselineState"].as_str().unwrap()))
        .collect();
    assert_eq!(states, [("R2", "new"), ("R1", "unchanged")]);
    assert_eq!(run.code, 1);
}
