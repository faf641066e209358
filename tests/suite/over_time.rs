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

/// A part with a transistor that nothing holds says so; the rectifier beside it, of which nothing is stored, repeats itself
/// with its source (Ohm's law).
#[test]
fn a_part_that_cannot_be_followed_says_nothing_of_the_others() {
    let swing = followed(
        "two parts\nV1 a 0 SIN(0 5 50)\nD1 a b DX\nR1 b 0 1k\nV2 c 0 SIN(0 5 50)\nR2 c d 1k\nQ1 d e 0 NX\nD2 e 0 DX\n\
         R3 e 0 1k\n.model NX NPN\n.model DX D\n*@ drop DX 0.6\n.tran 1u 100m\n",
    )
    .swing
    .expect("moving sources");
    assert!(swing.periodic, "{:?}", swing.cut_short);
    let peak = swing.diodes[0].over_time.as_ref().expect("followed").current_peak;
    assert!((peak - 4.4e-3).abs() < 1e-6, "{peak}");
    assert!(swing.diodes[1].over_time.is_none() && swing.diodes[1].not_evaluated.is_some());
}

/// A million periods are asked for, and the first of them show that these are too many: what is told is the periodic state,
/// whose mean and ripple are those of a held crest: (V − Vd)(1 − T/2RC) and (V − Vd)T/RC for RC far above T, common practice.
#[test]
fn too_many_periods_are_not_walked_through_first() {
    let swing = followed(
        "long\nV1 a 0 SIN(0 10 1meg)\nD1 a b DX\nR1 b 0 100k\nC1 b 0 1n\n.model DX D\n*@ drop DX 0.5\n.tran 10n 1\n",
    )
    .swing
    .expect("moving sources");
    assert!(swing.periodic && swing.cut_short.is_some(), "{:?}", swing.cut_short);
    let level = swing.nodes[1].over_time.expect("followed");
    assert!((level.ripple() - 0.095).abs() < 0.005, "{level:?}");
    assert!((level.mean - 9.5 * (1.0 - 0.005)).abs() < 0.01, "{level:?}");
    assert!(swing.effort.steps < 100_000, "{:?}", swing.effort);
}
