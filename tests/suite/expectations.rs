//! `expect` notes: in every condition, in one, in some; on elements, on models, inside instances. The numbers are worked
//! by hand: a drop of 0.7 V, R1 of 1 kΩ, so (V1 − 0.7 V)/1 kΩ.

use kneewise::analysis::analyse;
use kneewise::config::Options;
use kneewise::text::Memory;
use std::path::Path;

/// Rule and message of each finding about a note.
fn told(notes: &str) -> Vec<(&'static str, String)> {
    told_in(&format!(
        "expectations\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\nD2 0 a DX\n.model DX D\n*@ drop DX 0.7\n{notes}\n"
    ))
}

fn told_in(text: &str) -> Vec<(&'static str, String)> {
    let options = Options { states: true, swing: true, ..Options::default() };
    let analysis = analyse(&mut Memory::with("a.net", text), Path::new("a.net"), &options).unwrap();
    let rules = [
        "broken-over-time",
        "broken-expectation",
        "unchecked-expectation",
        "unknown-name",
        "conflicting-notes",
        "unusable-note",
    ];
    let about = analysis.findings.into_iter().filter(|f| rules.contains(&f.rule));
    about.map(|f| (f.rule, format!("{} | {}", f.message, f.help))).collect()
}

fn only(notes: &str) -> (&'static str, String) {
    let mut all = told(notes);
    assert_eq!(all.len(), 1, "{notes}: {all:?}");
    all.remove(0)
}

#[test]
fn what_holds_says_nothing() {
    for notes in [
        "*@ expect D1 conducting",
        "*@ expect D1 conducting 4.3m..4.3m",
        "*@ expect v(a) 0.7..0.7",
        "*@ expect d2 BLOCKING at NOMINAL",
        "*@ range V1 5 12\n*@ expect D1 conducting 4.3m..11.3m",
        "*@ range V1 -5 12\n*@ expect D1 conducting at v1=12.0\n*@ expect D1 blocking at V1=-5",
        "*@ range V1 -5 12\n*@ expect D2 conducting in some condition",
        // the element's note stands before its model's
        "*@ expect DX blocking\n*@ expect D1 conducting",
    ] {
        let told = told(notes);
        assert!(told.is_empty(), "{notes}: {told:?}");
    }
}

#[test]
fn what_does_not_hold_says_expected_found_condition_and_why() {
    let (rule, text) = only("*@ expect D1 blocking");
    assert_eq!(rule, "broken-expectation");
    assert!(
        text.starts_with("D1 should be blocking, but is conducting 4.3 mA | Assume D1 blocks: "),
        "{text}"
    );
    let (_, text) = only("*@ range V1 5 12\n*@ expect D1 conducting 4m..5m");
    assert!(text.contains("but is conducting 11.3 mA in condition V1=12 |"), "{text}");
    assert!(text.contains("Assume D1 conducts: "), "{text}");
    let (_, text) = only("*@ range V1 -5 12\n*@ expect D2 blocking");
    assert!(text.contains("but is conducting 4.3 mA in condition V1=-5 |"), "{text}");
    let (_, text) = only("*@ expect v(a) 0.5..0.69");
    assert!(text.contains("v(a) should be 500 mV … 690 mV, but is 700 mV |"), "{text}");
    assert!(text.contains("D1 (conducting 4.3 mA)"), "{text}");
    let (_, text) = only("*@ expect D1 breakdown");
    assert!(text.contains("no breakdown voltage"), "{text}");
    let (_, text) = only("*@ range V1 5 12\n*@ expect D2 conducting in some condition");
    assert!(text.contains("but is blocking in every condition"), "{text}");
}

#[test]
fn a_miss_too_small_for_three_digits_is_shown_with_more() {
    let (_, text) = only("*@ expect v(a) 0.5..0.69999");
    assert!(text.contains("but is 0.7 V") && text.contains("… 700 mV"), "{text}");
}

#[test]
fn what_names_nothing_or_cannot_be_checked_is_told() {
    assert_eq!(only("*@ expect D9 blocking").0, "unknown-name");
    assert_eq!(only("*@ expect v(nowhere) 1..2").0, "unknown-name");
    assert_eq!(only("*@ expect R1 blocking").0, "unusable-note");
    assert_eq!(only("*@ expect D1 conducting at V1=9").0, "unchecked-expectation");
    assert_eq!(only("*@ expect D1 conducting\n*@ expect D1 conducting 1m..9m").0, "conflicting-notes");
    let transistor = "t\nV1 in 0 5\nR1 in b 1k\nQ1 c b 0 QN\nD1 in c DX\n.model DX D\n.model QN NPN\n";
    let told = told_in(&format!("{transistor}*@ expect D1 conducting\n"));
    assert_eq!(told[0].0, "unchecked-expectation", "{told:?}");
    assert!(told[0].1.contains("Q1"), "{told:?}");
}

#[test]
fn notes_inside_a_subcircuit_hold_in_each_instance() {
    let clamp = "t\nV1 a 0 5\nV2 b 0 -5\nX1 a CLAMP\nX2 b CLAMP\n.subckt CLAMP in\nR1 in m 1k\nD1 m 0 DX\n\
                 *@ expect D1 conducting\n.ends\n.model DX D\n*@ drop DX 0.7\n";
    let told = told_in(clamp);
    assert_eq!(told.len(), 1, "{told:?}");
    assert!(told[0].1.starts_with("X2:D1 should be conducting, but is blocking"), "{told:?}");
    assert!(told[0].1.contains("in this one of 2 instances of CLAMP"), "{told:?}");
    let path = clamp
        .replace("*@ expect D1 conducting", "")
        .replace(".model", "*@ expect X2:D1 blocking\n*@ expect v(X1:m) 0.7..0.7\n.model");
    assert!(told_in(&path).is_empty(), "{:?}", told_in(&path));
}

#[test]
fn an_instant_does_not_judge_a_part_with_a_memory() {
    // a peak detector: at V1=min the capacitor decides, not the instant
    let detector =
        "t\nV1 in 0 SIN(0 10 50)\nD1 in out DX\nR1 out 0 10k\nC1 out 0 10u\n.model DX D\n*@ drop DX 0.7\n";
    assert!(told_in(&format!("{detector}*@ expect v(out) 0..1\n")).is_empty());
    // who names the instant asks about that one, as `states` shows it
    assert!(told_in(&format!("{detector}*@ expect D1 conducting at V1=max\n")).is_empty());
    let told = told_in(&format!("{detector}*@ expect D1 blocking at V1=max\n"));
    assert_eq!(told[0].0, "broken-expectation", "{told:?}");
    // without the capacitor every instant judges
    let plain = detector.replace("C1 out 0 10u\n", "");
    let told = told_in(&format!("{plain}*@ expect D1 blocking\n"));
    assert_eq!(told[0].0, "broken-expectation", "{told:?}");
}

#[test]
fn over_time_the_state_is_reached_and_the_value_bounds_the_extremes() {
    // half a wave: crest 10 V less the drop of 0.7 V over 1 kΩ is 9.3 mA, and it conducts a little less than half the time
    let circuit =
        "t\nV1 in 0 SIN(0 10 50)\nD1 in out DX\nR1 out 0 1k\nD2 out in DX\n.model DX D\n*@ drop DX 0.7\n";
    let held = "*@ expect D1 conducting 9.2m..9.4m over time\n*@ expect D1 blocking over time\n*@ expect v(out) -9.4..9.4 over time\n";
    assert!(told_in(&format!("{circuit}{held}")).is_empty(), "{:?}", told_in(&format!("{circuit}{held}")));
    let told = told_in(&format!("{circuit}*@ expect D1 conducting 1m..9m over time\n"));
    assert_eq!(told[0].0, "broken-over-time", "{told:?}");
    assert!(told[0].1.contains("but its current reaches 9.3 mA | It conducts 47."), "{told:?}");
    let told = told_in(&format!("{circuit}*@ expect v(out) -5..5 over time\n"));
    assert!(told[0].1.contains("but falls to -9.3 V"), "{told:?}");
    let told = told_in(&format!("{circuit}*@ expect D1 breakdown over time\n"));
    assert!(told[0].1.contains("breakdown does not occur"), "{told:?}");
    let told =
        told_in("t\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D\n*@ expect D1 conducting over time\n");
    assert_eq!(told[0].0, "unchecked-expectation", "{told:?}");
}
