//! Which conditions there are, how they are named, and what stands where in them.

use super::{Laid, evaluated};
use crate::config::Options;

#[test]
fn ends_come_before_corners_in_the_order_of_declaration() {
    let laid =
        Laid::out("VIN in 0 12\nR1 in 0 1k\n*@ range temp -40 85\n*@ range VIN 9 16", &Options::default());
    let names = [
        "nominal",
        "temp=-40",
        "temp=85",
        "VIN=9",
        "VIN=16",
        "temp=-40,VIN=9",
        "temp=-40,VIN=16",
        "temp=85,VIN=9",
        "temp=85,VIN=16",
    ];
    assert_eq!(laid.names(), names);
    assert_eq!(laid.source("temp=85,VIN=9", "vin"), 9.0);
    assert_eq!(laid.plan.conditions[8].temperature, 85.0);
    assert_eq!(laid.plan.conditions[0].temperature, 27.0);
    assert!(laid.findings.is_empty());
}

#[test]
fn six_ranges_have_all_corners_and_seven_none() {
    let ranges = |count: usize| {
        let resistors: String =
            (1..=count).map(|n| format!("R{n} in 0 1k\n*@ range R{n} 900 1100\n")).collect();
        Laid::out(&format!("V1 in 0 5\n{resistors}"), &Options::default())
    };
    assert_eq!(ranges(6).plan.conditions.len(), 1 + 12 + 64);
    let seven = ranges(7);
    assert_eq!(seven.plan.conditions.len(), 1 + 14);
    assert_eq!(seven.rules(), ["corners-left-out"]);
}

#[test]
fn moving_sources_are_examined_at_their_extremes_with_the_others_at_that_time() {
    let laid =
        Laid::out("V1 a 0 SIN(0 10 50)\nV2 b 0 PULSE(0 5 12m 1u 1u 5m 20m)\nR1 a b 1k", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=max", "V1=min", "V2=max", "V2=min"]);
    assert_eq!(laid.source("nominal", "V1"), 0.0);
    assert_eq!(laid.source("V1=max", "V1"), 10.0);
    assert_eq!(laid.source("V1=max", "V2"), 0.0);
    assert_eq!(laid.source("V1=min", "V1"), -10.0);
    assert_eq!(laid.source("V1=min", "V2"), 5.0);
    assert!(laid.plan.conditions[1].instant && !laid.plan.conditions[0].instant);
}

#[test]
fn a_source_with_a_value_stands_there_in_nominal_and_may_have_a_range() {
    let laid = Laid::out("V1 a 0 DC 3 SIN(0 10 50)\nR1 a 0 1k\n*@ range V1 2 4", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=2", "V1=4", "V1=max", "V1=min"]);
    assert_eq!(laid.source("nominal", "V1"), 3.0);
    let without = Laid::out("V1 a 0 SIN(0 10 50)\nR1 a 0 1k\n*@ range V1 2 4", &Options::default());
    assert_eq!(without.names(), ["nominal", "V1=max", "V1=min"]);
    assert_eq!(without.rules(), ["range-without-value"]);
}

#[test]
fn a_set_source_stands_still_and_has_no_range() {
    let options = Options { set: vec![("v1".into(), 7.0), ("NOPE".into(), 1.0)], ..Options::default() };
    let laid = Laid::out("V1 a 0 DC 3 SIN(0 10 50)\nR1 a 0 1k\n*@ range V1 2 4", &options);
    assert_eq!(laid.names(), ["nominal"]);
    assert_eq!(laid.source("nominal", "V1"), 7.0);
    assert_eq!(laid.rules(), ["unknown-name"]);
    assert!(laid.findings[0].message.contains("NOPE"), "{}", laid.findings[0].message);
}

#[test]
fn sweeps_are_ranges_unless_a_note_says_otherwise() {
    let laid = Laid::out("V1 a 0 3\nR1 a 0 1k\n.dc V1 0 5 0.1", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=0", "V1=5"]);
    let noted = Laid::out("V1 a 0 3\nR1 a 0 1k\n.dc V1 0 5 0.1\n*@ range V1 2 4", &Options::default());
    assert_eq!(noted.names(), ["nominal", "V1=2", "V1=4"]);
    assert!(noted.findings.is_empty());
}

#[test]
fn supplies_hold_what_the_netlist_does_not_feed() {
    let laid =
        Laid::out("R1 +12V a 1k\nD1 a 0 DX\n*@ supply +12V 12 9..16\n.model DX D", &Options::default());
    assert_eq!(laid.names(), ["nominal", "+12V=9", "+12V=16"]);
    assert_eq!(laid.plan.conditions[1].supplies[0].value, 9.0);
    let fed = Laid::out("V1 a 0 5\nR1 a 0 1k\n*@ supply a 12", &Options::default());
    assert!(fed.plan.supplies.is_empty());
    assert_eq!(fed.rules(), ["unusable-note"]);
    let set = Options { set: vec![("+12V".into(), 10.0)], ..Options::default() };
    let laid = Laid::out("R1 +12V 0 1k\n*@ supply +12V 12 9..16", &set);
    assert_eq!(laid.names(), ["nominal"]);
    assert_eq!(laid.plan.conditions[0].supplies[0].value, 10.0);
}

#[test]
fn what_is_held_both_ways_is_off_in_nominal_and_each_in_a_condition() {
    let laid = Laid::out(
        "VIN c 0 5\nQ1 c b 0 QX\n.model QX NPN\n*@ hold Q1 both\n*@ range VIN 4 6",
        &Options::default(),
    );
    assert_eq!(laid.names(), ["nominal", "VIN=4", "VIN=6", "Q1=on", "Q1=off", "VIN=4,Q1=on", "VIN=6,Q1=on"]);
    let q1 = laid.element("Q1");
    assert_eq!(laid.plan.conditions[0].held, [(q1, false)]);
    assert_eq!(laid.plan.conditions[3].held, [(q1, true)]);
}

#[test]
fn a_second_note_on_one_name_is_told() {
    let laid = Laid::out("V1 a 0 3\nR1 a 0 1k\n*@ range V1 2 4\n*@ range v1 1 5", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=2", "V1=4"]);
    assert_eq!(laid.rules(), ["conflicting-notes"]);
}
#[test]
fn parameters_may_have_ranges() {
    let laid = Laid::out(".param vs=5\nV1 a 0 {vs}\nR1 a 0 1k\n*@ range vs 4 6", &Options::default());
    assert_eq!(laid.names(), ["nominal", "vs=4", "vs=6"]);
    assert_eq!(laid.plan.conditions[1].parameters, [("vs".to_owned(), 4.0)]);
}

#[test]
fn many_moving_sources_do_not_make_endless_conditions() {
    let sources: String =
        (0..40).map(|n| format!("V{n} n{n} 0 SIN(0 1 {})\nR{n} n{n} 0 1k\n", n + 1)).collect();
    let laid = Laid::out(&sources, &Options::default());
    assert_eq!(laid.plan.conditions.len(), 1 + 2 * 32);
    assert_eq!(laid.rules(), ["corners-left-out"]);
}

#[test]
fn names_show_no_digits_that_arithmetic_left_behind() {
    let laid = Laid::out("V1 a 0 3.3\nR1 a 0 1k\n*@ range V1 3.3 10%", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=2.97", "V1=3.63"]);
}

#[test]
fn a_range_of_one_value_is_one_condition() {
    let laid = Laid::out("V1 a 0 3\nR1 a 0 1k\n.dc V1 5 5 1\n*@ range temp 0 50", &Options::default());
    assert_eq!(laid.names(), ["nominal", "V1=5", "temp=0", "temp=50", "V1=5,temp=0", "V1=5,temp=50"]);
}

#[test]
fn sources_that_move_together_are_examined_once() {
    let text = |phase: u32| {
        let mut text = String::from(".tran 1m 40m\n");
        for n in 0..20 {
            text += &format!("V{n} a{n} 0 SIN(0 9 50 0 0 {})\n", n * phase);
            text += &format!("D{n} a{n} b{n}\nR{n} b{n} 0 1k\n");
        }
        text
    };
    let different = |phase| {
        let mut twins = Laid::out(&text(phase), &Options::default()).plan.twins();
        twins.dedup();
        (twins.len(), twins)
    };
    // nominal, then the two instants of all; with phases of their own each has its own
    assert_eq!(different(0).0, 41); // as many as conditions, since they alternate
    assert!(different(0).1.iter().all(|&twin| twin < 3));
    assert_eq!(different(7).1, (0..41).collect::<Vec<_>>());
    // each has its own name and the answer of its first
    let (operating, ..) = evaluated(&text(0), &Options::default());
    let named = |name: &str| operating.cases.iter().find(|c| c.name == name).unwrap();
    assert_eq!(named("V0=max").solutions, named("V19=max").solutions);
    assert_ne!(named("V0=max").solutions, named("V19=min").solutions);
}
