//! Which single source changes a state: by hand from the constant-drop model.

use super::told;
use crate::circuit::State;

/// Flips of a diode in nominal: source, value, state beyond.
fn flips(lines: &str, diode: &str) -> Vec<(String, f64, State)> {
    let why = told(lines, diode);
    let flips = &why.reasonings[0].flips;
    flips.iter().map(|f| (f.source.clone(), (f.to * 1e6).round() / 1e6, f.state)).collect()
}

#[test]
fn a_conducting_diode_blocks_below_its_drop() {
    let found = flips("V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D", "D1");
    assert_eq!(found, [("V1".into(), 0.7, State::Blocking)]);
}

#[test]
fn a_blocking_diode_may_change_both_ways_nearest_first() {
    let found = flips("V1 in 0 3\nR1 in a 1k\nD1 0 a DZ\n.model DZ D(BV=5.1)", "D1");
    assert_eq!(found, [("V1".into(), 5.1, State::Breakdown), ("V1".into(), -0.7, State::Conducting)]);
}

#[test]
fn either_supply_of_two_joined_by_diodes_can_take_over() {
    let found = flips("V1 a 0 5\nV2 b 0 4.8\nD1 a out DX\nD2 b out DX\nR1 out 0 1k\n.model DX D", "D2");
    assert_eq!(found, [("V1".into(), 4.8, State::Conducting), ("V2".into(), 5.0, State::Conducting)]);
}

#[test]
fn changes_of_other_diodes_on_the_way_are_passed() {
    // D1 conducts from 0.7 V on; D2 needs 3.7 V at `a`: 3 mA through R3, so 6.7 V from V1
    let lines = |volts: &str| {
        format!("V1 in 0 {volts}\nR1 in a 1k\nD1 a c DX\nR3 c 0 1k\nD2 a b DX\nV2 b 0 3\n.model DX D")
    };
    let of_v1 = |volts: &str| {
        let found = flips(&lines(volts), "D2");
        found.into_iter().filter(|f| f.0 == "V1").collect::<Vec<_>>()
    };
    assert_eq!(of_v1("0.68"), [("V1".into(), 6.7, State::Conducting)]);
    assert_eq!(of_v1("0.66"), []);
}

#[test]
fn beyond_a_change_there_may_be_no_consistent_state() {
    let found = flips("I1 0 a 1m\nD1 a 0 DX\n.model DX D", "D1");
    assert_eq!(found, [("I1".into(), 0.0, State::NotEvaluated)]);
}

#[test]
fn none_within_ten_times_is_an_answer() {
    let why = told(
        "V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\nV2 x 0 -60\nR2 x y 1k\nD2 y 0 DX\n.model DX D\n*@ drop D2 800",
        "D2",
    );
    assert!(why.reasonings[0].flips.is_empty());
    assert!(
        why.reasonings[0].flip_sentence.contains("within ten times"),
        "{}",
        why.reasonings[0].flip_sentence
    );
}
