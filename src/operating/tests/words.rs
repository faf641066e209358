//! The reasoning in words, with views set by hand.

use super::evaluated;
use crate::complementarity::View;
use crate::config::Options;
use crate::operating::speaker::sentences;

/// The sentences about the only diode of a circuit with one source behind one resistor.
fn reasoning(volts: &str, model: &str, open_circuit: f64, margin: f64) -> Vec<String> {
    let lines = format!("V1 in 0 {volts}\nR1 in a 1k\nD3 a 0 DX\n.model DX D({model})");
    let (operating, circuit, _) = evaluated(&lines, &Options::default());
    let case = &operating.cases[0];
    let mut diode = case.solutions[0].diodes[0].clone();
    diode.view = Some(View { open_circuit, resistance: 1e3 });
    diode.margin = Some(margin);
    sentences(&circuit, case, &diode)
}

// all numbers by hand from the constant-drop model
#[test]
fn a_conducting_diode() {
    assert_eq!(
        reasoning("4.62", "", 4.62, 3.92),
        [
            "D3 has a drop of 700 mV (default).",
            "Assume D3 blocks: with every other diode in its state the rest of the circuit puts 4.62 V across it, more than its drop of 700 mV, so that assumption fails.",
            "Assume it conducts: (4.62 V − 700 mV) / 1 kΩ = 3.92 mA flows from anode to cathode, which is forward, so this holds.",
            "Margin: its drop would have to exceed 4.62 V, 3.92 V more, to change the state.",
        ]
    );
}

#[test]
fn a_blocking_diode() {
    assert_eq!(
        reasoning("-3", "BV=5.1", -3.0, 2.1)[1..],
        [
            "Assume D3 conducts: (-3 V − 700 mV) / 1 kΩ = -3.7 mA would have to flow from anode to cathode, which is backward, so that assumption fails.",
            "Assume it breaks down: (-3 V + 5.1 V) / 1 kΩ = 2.1 mA would have to flow, which is forward, so that assumption fails.",
            "Assume it blocks: with every other diode in its state the rest of the circuit puts -3 V across it, less than its drop of 700 mV and above its breakdown at -5.1 V, so this holds.",
            "Margin: 2.1 V less across it and it would break down.",
        ]
    );
}

#[test]
fn a_diode_in_breakdown() {
    assert_eq!(
        reasoning("-9", "BV=5.1", -9.0, 3.9)[1..],
        [
            "Assume D3 blocks: with every other diode in its state the rest of the circuit puts -9 V across it, beyond its breakdown at -5.1 V, so that assumption fails.",
            "Assume it breaks down: (-9 V + 5.1 V) / 1 kΩ = -3.9 mA flows from anode to cathode, which is backward, so this holds.",
            "Margin: its breakdown voltage would have to exceed 9 V, 3.9 V more, to change the state.",
        ]
    );
}

#[test]
fn near_ties_show_enough_digits() {
    let close = reasoning("0.7000001", "", 0.7000001, 1e-7);
    assert!(close[1].contains("0.7000001 V across it, more than its drop of 0.7 V"), "{}", close[1]);
    let corner = reasoning("0.7", "", 0.7, 0.0);
    assert!(corner[1].contains("exactly at a corner"), "{}", corner[1]);
}
