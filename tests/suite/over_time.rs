//! What the pass over time makes of whole netlists, through the public interface.

use kneewise::analysis::{Analysis, analyse};
use kneewise::config::Options;
use kneewise::text::Memory;
use std::path::Path;

fn followed(text: &str) -> Analysis {
    let options = Options { states: true, swing: true, ..Options::default() };
    analyse(&mut Memory::with("a.net", text.as_bytes()), Path::new("a.net"), &options).expect("a netlist")
}

/// A resistor that hands the envelope on to a high-resistance stage, written before the detector's own parts.
#[test]
fn a_coupling_resistor_discharges_nothing() {
    let rule = kneewise::rules::find("detector-time-constant").expect("a rule");
    let coupled = |text: &str| text.replace("C1 env", "RK env next 1k\nRN next 0 1g\nC1 env");
    let finds = |text: &str| followed(text).findings.iter().filter(|f| f.rule == rule.name).count();
    assert_eq!(finds(&coupled(rule.failing)), 1);
    assert_eq!(finds(&coupled(&rule.failing.replace("100n", "3.9n"))), 0);
}

/// Kirchhoff's voltage law: the diode sees the sum of the stack, whichever of its nodes are held.
#[test]
fn a_long_stack_of_moving_sources_is_solved_for() {
    let count = 72;
    let mut text = String::from("stack\n");
    for n in 0..count {
        let below = if n == 0 { "0".into() } else { format!("n{n}") };
        text += &format!("V{n} n{} {below} SIN(0 0.05 50)\n", n + 1);
    }
    text += &format!("D1 n{count} out DX\nR1 out 0 1k\n.model DX D\n*@ drop DX 0.6\n");
    let swing = followed(&text).swing.expect("moving sources");
    let peak = swing.diodes[0].over_time.as_ref().expect("followed").current_peak;
    let expected = (0.05 * f64::from(count) - 0.6) / 1e3;
    assert!((peak - expected).abs() < 1e-4 * expected, "{peak} {expected}");
}
