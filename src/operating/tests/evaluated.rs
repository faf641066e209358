//! Whole circuits through all of the operating point.

use super::{evaluated, told};
use crate::circuit::State;
use crate::complementarity::{Quantity, Verdict};
use crate::config::Options;
use crate::operating::{Case, DiodeResult};

fn diode(case: &Case, at: usize) -> &DiodeResult {
    &case.solutions[0].diodes[at]
}

#[test]
fn the_decade_of_a_model_follows_the_current_and_is_held_over_ranges() {
    let lines = "V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D(IS=10f)\n*@ range V1 5 500";
    let (operating, _, _) = evaluated(lines, &Options::default());
    let origins: Vec<String> = operating.cases.iter().map(|c| diode(c, 0).drop.origin.to_string()).collect();
    // 4.3 mA is nearer to 10 mA than to 1 mA in the logarithm; 0.5 A in the range does not count
    assert_eq!(origins, ["model DX at 10mA"; 3]);
    let resting = lines.replace("V1 in 0 5", "V1 in 0 0.1");
    let (operating, _, _) = evaluated(&resting, &Options::default());
    assert_eq!(diode(&operating.cases[0], 0).drop.origin.to_string(), "model DX at 1mA");
}

#[test]
fn a_moving_source_counts_for_the_decade() {
    let (operating, _, _) =
        evaluated("V1 in 0 SIN(0 100 50)\nR1 in a 1k\nD1 a 0 DX\n.model DX D(IS=10f)", &Options::default());
    assert_eq!(operating.cases.len(), 3);
    assert!(operating.cases.iter().all(|c| diode(c, 0).drop.origin.to_string() == "model DX at 100mA"));
    assert_eq!(diode(&operating.cases[1], 0).state, State::Conducting);
    assert_eq!(diode(&operating.cases[2], 0).state, State::Blocking);
}

#[test]
fn temperature_moves_what_it_should() {
    let lines = "V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D\n*@ range temp -23 77";
    let (operating, _, _) = evaluated(lines, &Options::default());
    let volts: Vec<f64> = operating.cases.iter().map(|c| diode(c, 0).drop.volts).collect();
    assert!(
        (volts[0] - 0.7).abs() < 1e-12 && (volts[1] - 0.8).abs() < 1e-12 && (volts[2] - 0.6).abs() < 1e-12
    );
}

#[test]
fn a_range_of_a_parameter_expands_the_circuit_again() {
    let lines = ".param vs=5\nV1 in 0 {vs}\nV2 x 0 {2*vs}\nR1 in a {vs*200}\nD1 a 0 DX\nR2 x 0 1k\n.model DX D\n*@ range vs 4 6";
    let (operating, _, _) = evaluated(lines, &Options::default());
    let sources: Vec<Vec<f64>> =
        operating.cases.iter().map(|c| c.sources.iter().map(|s| s.1).collect()).collect();
    assert_eq!(sources, [[5.0, 10.0], [4.0, 8.0], [6.0, 12.0]]);
    // (4 V − 0.7 V)/800 Ω by hand
    let current = diode(&operating.cases[1], 0).current.known().unwrap();
    assert!((current - 4.125e-3).abs() < 1e-12, "{current}");
}

#[test]
fn a_loop_without_resistance_is_told_with_its_numbers() {
    let (operating, circuit, _) = evaluated(
        "V1 a 0 5\nD1 a b DX\nD2 b 0 DX\nV2 c 0 5\nR1 c d 1k\nD3 d 0 DX\n.model DX D",
        &Options::default(),
    );
    let case = &operating.cases[0];
    assert_eq!(case.verdict, Verdict::None);
    let cause = &case.causes[0];
    let mut names: Vec<String> = cause.elements.iter().map(|&e| circuit.element_name(e)).collect();
    names.sort();
    assert_eq!(names, ["D1", "D2", "V1"]);
    assert!(cause.text.contains("5 V drives 1.4 V of drops"), "{}", cause.text);
    // the sound part keeps its answer
    assert_eq!(diode(case, 0).state, State::NotEvaluated);
    assert!(diode(case, 0).not_evaluated.as_ref().unwrap().contains("no limit"));
    assert_eq!(diode(case, 2).state, State::Conducting);
}

#[test]
fn unknown_elements_are_named_until_a_note_holds_them() {
    let lines = "VCC vcc 0 12\nRL vcc k 120\nD1 k vcc DX\nQ1 k b 0 QX\nVB b 0 1\n.model QX NPN\n.model DX D";
    let (operating, _, _) = evaluated(lines, &Options::default());
    assert_eq!(operating.cases[0].verdict, Verdict::Partial);
    let reason = diode(&operating.cases[0], 0).not_evaluated.clone().unwrap();
    assert!(reason.contains("Q1") && reason.contains("no `hold` note"), "{reason}");
    let held = format!("{lines}\n*@ hold Q1 both");
    let (operating, _, _) = evaluated(&held, &Options::default());
    assert!(operating.cases.iter().all(|c| c.verdict == Verdict::Unique), "{:?}", operating.cases[1].causes);
    let on = operating.cases.iter().find(|c| c.name == "Q1=on").unwrap();
    assert_eq!(diode(on, 0).voltage, Quantity::Known(-12.0));
    let off = operating.cases.iter().find(|c| c.name == "Q1=off").unwrap();
    assert_eq!(diode(off, 0).voltage.known().map(f64::abs), Some(0.0));
}

#[test]
fn boards_without_sources_run_from_their_supplies() {
    let lines = "R1 +12V a 1k\nD1 a 0 DX\n.model DX D\n*@ supply +12V 12 9..16";
    let (operating, circuit, _) = evaluated(lines, &Options::default());
    let case = &operating.cases[1];
    assert_eq!(case.name, "+12V=9");
    assert_eq!(circuit.node_name(case.supplies[0].0), "+12V");
    let current = diode(case, 0).current.known().unwrap();
    assert!((current - 8.3e-3).abs() < 1e-12);
}

#[test]
fn what_a_capacitor_remembers_is_left_to_time() {
    let lines = "V1 in 0 SIN(0 10 50)\nD1 in out DX\nC1 out 0 1u\nR1 out 0 1k\nR2 in b 1k\nD2 b 0 DX\nV3 c 0 5\nR3 c d 1k\nD3 d 0 DX\nC3 d 0 1u\n.model DX D";
    let (operating, circuit, _) = evaluated(lines, &Options::default());
    let names: Vec<String> = operating.left_to_time.iter().map(|&d| circuit.element_name(d)).collect();
    assert_eq!(names, ["D1"]);
    assert!(operating.cases[1].instant && !operating.cases[0].instant);
}

#[test]
fn the_reasoning_is_told_once_for_conditions_that_share_a_state() {
    let why = told("V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D\n*@ range V1 0 10", "D1");
    assert_eq!(why.reasonings.len(), 2);
    assert_eq!(why.reasonings[0].cases, ["nominal", "V1=10"]);
    assert_eq!(why.reasonings[1].cases, ["V1=0"]);
    let all = why.reasonings[0].sentences.join(" ");
    assert!(all.contains("9.3 mA (V1=10)"), "{all}");
}

#[test]
fn asking_about_what_is_not_there_is_told() {
    let options = Options { why: Some("D9".into()), ..Options::default() };
    let (operating, _, findings) = evaluated("V1 in 0 5\nR1 in 0 1k", &options);
    assert!(operating.why.is_none());
    assert_eq!(findings[0].rule, "unknown-name");
}

#[test]
fn what_is_open_is_named() {
    let shared = "V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\nD2 a 0 DX\n.model DX D";
    let (operating, circuit, _) = evaluated(shared, &Options::default());
    let case = &operating.cases[0];
    assert_eq!(case.verdict, Verdict::Shared);
    assert_eq!(case.causes[0].text, "how the current divides among D1 and D2 is open");
    let names: Vec<String> = case.causes[0].elements.iter().map(|&e| circuit.element_name(e)).collect();
    assert_eq!(names, ["D1", "D2"]);
    // 4.3 mA in all, by hand
    let Quantity::Open(interval) = diode(case, 0).current else { unreachable!("open") };
    assert!(interval.low == 0.0 && (interval.high - 4.3e-3).abs() < 1e-12, "{interval:?}");
    let (operating, _, _) =
        evaluated("V1 in 0 5\nD1 x in DX\nD2 x y DX\nR1 y 0 1k\n.model DX D", &Options::default());
    let case = &operating.cases[0];
    assert_eq!(case.verdict, Verdict::Floating);
    assert_eq!(case.causes[0].text, "the potential of node x is open");
}

#[test]
fn the_view_and_the_margin_of_one_diode() {
    // 5 V behind 1 kΩ; the drop would have to rise by 4.3 V
    let (operating, _, _) =
        evaluated("V1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D(RS=10)", &Options::default());
    let diode = diode(&operating.cases[0], 0);
    let view = diode.view.unwrap();
    assert!((view.open_circuit - 5.0).abs() < 1e-12 && (view.resistance - 1010.0).abs() < 1e-9, "{view:?}");
    assert!((diode.margin.unwrap() - 4.3).abs() < 1e-12);
}

/// Nothing flows where a diode blocks in front of a follower, a chain of them, or sources that sense it: every node behind
/// it is at 0 V and the one before it at the source's voltage, by Kirchhoff's laws alone.
#[test]
fn what_stands_still_behind_a_controlled_source_is_proved() {
    let behind = [
        "E1 out 0 hold 0 1\nR3 out adc 1k\nR4 adc 0 47k",
        "E1 e1 0 hold 0 1\nE2 e2 0 e1 0 -3.3\nE3 e3 0 e2 e1 7\nR3 e2 q 3.3k\nR4 q e3 47k\nR5 e3 0 1meg",
        "G1 0 g hold 0 3m\nR3 g 0 3.3k\nF1 f 0 E1 30\nE1 e 0 g hold 11\nR4 e 0 910\nR5 f f2 1.1k\nR6 f2 0 3k",
        "E1 out 0 a in 1000\nR3 out mid 0.3\nR4 mid adc 4.7g\nR5 adc 0 9.1\nH1 h 0 V1 70\nR6 h 0 11",
    ];
    for (behind, volts) in behind.iter().flat_map(|b| [-3.0, -0.1, -7.7, -1234.5].map(|v| (b, v))) {
        for ohms in ["1m", "33", "100", "4.7k", "1.3g", "2t"] {
            let lines = format!(
                "V1 in 0 {volts}\nR1 in a {ohms}\nD1 a hold DX\nR2 hold 0 100k\n{behind}\n.model DX D"
            );
            let (operating, circuit, _) = evaluated(&lines, &Options::default());
            let case = &operating.cases[0];
            assert_eq!(case.verdict, Verdict::Unique, "{lines}\n{:?}", case.causes);
            for node in &case.solutions[0].nodes {
                let name = circuit.node_name(node.node);
                let expected = if ["in", "a"].contains(&name.as_str()) { volts } else { 0.0 };
                assert_eq!(node.voltage.known(), Some(expected), "{name} of\n{lines}");
            }
            for branch in &case.solutions[0].branches {
                assert_eq!(branch.current.known(), Some(0.0), "{lines}");
            }
        }
    }
}

/// Where nanoamperes are real beside kiloamperes they are told: (1 V − 0)/1 GΩ in front of a follower, and the follower's
/// 1 V across 1 mΩ behind it, by Ohm's law.
#[test]
fn small_currents_beside_a_follower_are_no_rounding() {
    let lines = "V1 in 0 1\nR1 in a 1g\nV0 a 0 0\nE1 out 0 in 0 1\nR2 out x 1m\nV2 x 0 0\nR3 x y 1t\nV3 y 0 -1\nR4 out z 1n\nD1 z 0 DX\n.model DX D";
    let (operating, circuit, _) = evaluated(lines, &Options::default());
    let case = &operating.cases[0];
    assert_eq!(case.verdict, Verdict::Unique, "{:?}", case.causes);
    for (name, expected) in [("R1", 1e-9), ("R2", 1e3), ("R3", 1e-12)] {
        let found = case.solutions[0].branches.iter().find(|b| circuit.element_name(b.element) == name);
        let current = found.and_then(|b| b.current.known()).unwrap();
        assert!((current - expected).abs() <= 1e-12 * expected, "{name}: {current}");
    }
}
