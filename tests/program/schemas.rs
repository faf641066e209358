//! Every JSON output obeys its schema in `grammar/`, has its keys in the promised order, and the schemas say no
//! where they should.

use crate::runner::{feed, root, run};
use jsonschema::Validator;
use serde_json::Value;

fn schema(name: &str) -> Validator {
    let text = std::fs::read_to_string(root().join("grammar").join(name)).unwrap();
    jsonschema::validator_for(&serde_json::from_str(&text).unwrap()).unwrap()
}

fn check(schema: &Validator, text: &str, about: &str) -> Value {
    let document: Value = serde_json::from_str(text).unwrap();
    let problems: Vec<String> =
        schema.iter_errors(&document).map(|e| format!("{}: {e}", e.instance_path())).collect();
    assert!(problems.is_empty(), "{about}:\n{}", problems.join("\n"));
    document
}

fn fixtures() -> Vec<String> {
    let mut names: Vec<String> = std::fs::read_dir(root().join("fixtures"))
        .unwrap()
        .map(|e| format!("fixtures/{}", e.unwrap().file_name().to_string_lossy()))
        .filter(|name| name.ends_with(".net"))
        .collect();
    names.sort();
    names
}

#[test]
fn findings_obey_their_schema() {
    let schema = schema("findings.schema.json");
    let document = check(&schema, &run(&["check", "fixtures", "--format", "json"]).out, "fixtures");
    assert!(!document["findings"].as_array().unwrap().is_empty());
    for netlist in ["", "t\n", "t\nD1 a\n", "t\nR1 a 0 1M\nV1 a 0 0,5\n.foo\n", "\u{feff}t\nV1 é 0 1\n"] {
        check(&schema, &feed(&["check", "-", "--format", "json"], netlist).out, netlist);
    }
}

#[test]
fn states_obey_their_schema() {
    let schema = schema("states.schema.json");
    for name in fixtures() {
        check(&schema, &run(&["states", &name, "--format", "json"]).out, &name);
    }
    for netlist in [
        "",
        "t\nV1 a 0 5\nD1 a 0 DX\n",
        "t\nI1 0 a 1m\nD1 a 0 DX\nD2 a 0 DX\n.model DX D\n",
        "t\nD1 a b DX\nD2 c b DX\nV1 a 0 5\nV2 c 0 5\n.model DX D\n",
        "t\nQ1 c b 0 QN\nV1 a 0 5\nD1 a c DX\nR1 b a 1k\n.model DX D\n.model QN NPN\n",
    ] {
        check(&schema, &feed(&["states", "-", "--format", "json"], netlist).out, netlist);
    }
}

#[test]
fn swings_obey_their_schema() {
    let schema = schema("swing.schema.json");
    for name in fixtures() {
        check(&schema, &run(&["swing", &name, "--format", "json"]).out, &name);
    }
    for netlist in [
        "",
        "t\nV1 a 0 SIN(0 5 50)\nD1 a b DX\nR1 b 0 1k\n.model DX D\n",
        "t\nV1 a 0 SIN(0 5 50)\nD1 a 0 DX\n.model DX D\n",
        "t\nV1 a 0 SIN(0 5 50)\nQ1 a b 0 QN\nD1 a b DX\n.model DX D\n.model QN NPN\n",
        "t\nC1 a 0 1u IC=1\nR1 a 0 1k\n.tran 1u 1m uic\n",
        "t\nC1 a 0 1u IC=1\nD1 a b DX\nC2 b 0 1u\n.tran 1u 1m uic\n.model DX D\n",
    ] {
        check(&schema, &feed(&["swing", "-", "--format", "json"], netlist).out, netlist);
    }
    let text = feed(
        &["swing", "-", "--format", "json"],
        "t\nV1 a 0 SIN(0 5 50)\nD1 a b DX\nR1 b 0 1k\n.model DX D\n",
    )
    .out;
    let mut wrong = check(&schema, &text, "a half wave");
    wrong["diodes"][0]["conducting_share"] = 2.into();
    assert!(!schema.is_valid(&wrong));
    assert_order(
        &text,
        &[
            "format",
            "version",
            "file",
            "span_s",
            "period_s",
            "periodic",
            "diodes",
            "name",
            "conducting_share",
            "intervals_s",
            "current_mean_A",
            "current_rms_A",
            "current_peak_A",
            "charge_span_A",
            "decades",
            "peak_reverse_V",
            "over_conditions",
            "nodes",
            "name",
            "mean_V",
            "min_V",
            "max_V",
            "ripple_V",
        ],
    );
}

#[test]
fn pictures_are_drawn_and_the_same_every_time() {
    let folder = std::env::temp_dir().join(format!("kneewise-pictures-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    for (name, begins) in [("a.svg", "<svg"), ("b.html", "<!doctype html>")] {
        let path = folder.join(name).display().to_string();
        let mut drawn = Vec::new();
        for _ in 0..2 {
            run(&["swing", "fixtures/bench-supply.net", "--plot", &path]);
            drawn.push(std::fs::read_to_string(&path).unwrap());
        }
        assert_eq!(drawn[0], drawn[1]);
        assert!(drawn[0].starts_with(begins), "{}", &drawn[0][..80]);
        for word in [
            "conducting",
            "blocking",
            "v(raw)",
            "peak to peak",
            "where the drop holds",
            "prefers-color-scheme",
        ] {
            assert!(drawn[0].contains(word), "{name} says nothing of {word}");
        }
    }
    std::fs::remove_dir_all(&folder).unwrap();
}

/// Fails unless these keys stand in this order, others between them or not.
fn assert_order(text: &str, keys: &[&str]) {
    let mut rest = text;
    for key in keys {
        let quoted = format!("\"{key}\":");
        let at = rest.find(&quoted).unwrap_or_else(|| panic!("{key} is missing or out of order in {text}"));
        rest = &rest[at + quoted.len()..];
    }
}

#[test]
#[rustfmt::skip]
fn keys_of_states_stand_in_the_promised_order() {
    let netlist = "t\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n*@ drop D1 0.7\n.model DX D\n.end\n";
    assert_order(&feed(&["states", "-", "--format", "json"], netlist).out, &[
        "format", "version", "file", "cases", "case", "sources", "temperature_C", "verdict", "reason", "truncated",
        "solves", "residual", "current_A", "voltage_V", "solutions", "diodes", "name", "line", "file", "state",
        "voltage_V", "current_A", "power_W", "current_range_A", "voltage_range_V", "drop_V", "drop_origin",
        "open_circuit_V", "source_resistance_ohm", "margin_V", "trust", "trust_reasons", "refined", "nodes", "name",
        "voltage_V", "range_V", "branches", "name", "current_A", "range_A",
    ]);
}

#[test]
#[rustfmt::skip]
fn keys_of_findings_stand_in_the_promised_order() {
    let netlist = "t\nV1 in 0 5\nR1 in 0 1M\n.end\n";
    let text = feed(&["check", "-", "--format", "json"], netlist).out;
    assert_order(&text, &[
        "format", "version", "findings", "rule", "severity", "file", "line", "column", "end_line", "end_column",
        "message", "subjects", "labels", "trail", "help", "fix", "accepted", "skipped", "summary", "files", "errors",
        "warnings", "notes", "elements", "diodes",
    ]);
    let document: Value = serde_json::from_str(&text).unwrap();
    let finding = &document["findings"][0];
    let place = ["line", "column", "end_line", "end_column"].map(|key| finding[key].as_u64().unwrap());
    assert_eq!((place, &finding["subjects"][0]), ([3, 9, 3, 11], &Value::from("R1")), "{text}");
}

#[test]
fn the_schemas_refuse_what_is_wrong() {
    let schema = schema("states.schema.json");
    let netlist = "t\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D\n.end\n";
    let text = feed(&["states", "-", "--format", "json"], netlist).out;
    let good = check(&schema, &text, netlist);
    let mut wrong = good.clone();
    wrong["cases"][0]["solutions"][0]["diodes"][0]["state"] = "on".into();
    assert!(!schema.is_valid(&wrong));
    let mut wrong = good;
    wrong["cases"][0].as_object_mut().unwrap().remove("verdict");
    assert!(!schema.is_valid(&wrong));
}
