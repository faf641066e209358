//! How transistors and switches enter the network.

use super::Laid;
use crate::complementarity::Law;
use crate::config::Options;
use crate::operating::assemble::{NONE, Setting, assemble};

/// Law of an element's branch in a condition; `None` where it has no branch.
fn law(lines: &str, condition: usize, name: &str) -> Option<Law> {
    let laid = Laid::out(lines, &Options::default());
    let slots = laid.slots();
    let setting = Setting {
        circuit: &laid.circuit,
        plan: &laid.plan,
        slots: &slots,
        diodes: &laid.diodes,
        condition: &laid.plan.conditions[condition],
    };
    let assembly = assemble(&setting);
    let branch = assembly.branch[laid.element(name).index()];
    (branch != NONE).then(|| assembly.network.branches[branch as usize].law)
}

#[test]
fn a_held_transistor_joins_its_main_path() {
    let lines = "VCC c 0 5\nR1 b 0 1k\nQ1 c b e QX\nRE e 0 1k\n.model QX NPN\n*@ hold Q1 both";
    assert_eq!(law(lines, 0, "Q1"), None);
    assert_eq!(law(lines, 1, "Q1"), Some(Law::Short));
    let free = lines.replace("*@ hold Q1 both", "");
    assert_eq!(law(&free, 0, "Q1"), Some(Law::Unknown));
}

#[test]
fn a_switch_follows_a_control_that_sources_hold() {
    let lines = |volts: f64, model: &str| {
        format!("V1 a 0 12\nVC p q {volts}\nVQ q 0 1\nS1 a b p q SX\nR1 b 0 1k\n.model SX SW({model})")
    };
    let model = "VT=2.5 VH=0.5 RON=0.1 ROFF=10meg";
    assert_eq!(law(&lines(5.0, model), 0, "S1"), Some(Law::Resistance(0.1)));
    assert_eq!(law(&lines(1.0, model), 0, "S1"), Some(Law::Resistance(1e7)));
    // within the hysteresis its history decides
    assert_eq!(law(&lines(2.7, model), 0, "S1"), Some(Law::Unknown));
    // usual values, from memory: threshold 0, 1 Ω closed, 1 MΩ open
    assert_eq!(law(&lines(1.0, "RON=1"), 0, "S1"), Some(Law::Resistance(1.0)));
    assert_eq!(law(&lines(-1.0, "RON=1"), 0, "S1"), Some(Law::Resistance(1e6)));
    let unheld = "V1 a 0 12\nS1 a b b 0 SX\nR1 b 0 1k\n.model SX SW(VT=1)";
    assert_eq!(law(unheld, 0, "S1"), Some(Law::Unknown));
}

#[test]
fn a_switch_follows_a_current_that_a_source_drives() {
    let lines = |amperes: &str| {
        format!("V1 a 0 12\nI1 0 c {amperes}\nVM c 0 0\nW1 a b VM WX\nR1 b 0 1k\n.model WX CSW(IT=1m RON=2)")
    };
    assert_eq!(law(&lines("5m"), 0, "W1"), Some(Law::Resistance(2.0)));
    assert_eq!(law(&lines("-5m"), 0, "W1"), Some(Law::Resistance(1e6)));
}

#[test]
fn elements_become_their_laws() {
    let lines = "V1 a 0 5\nR0 a b 0\nL1 b c 1m\nC1 c 0 1u\nR1 c 0 1k\nF1 0 c V1 2\nE1 d 0 a c 3\nR2 d 0 1k\nT1 a 0 d 0 Z0=50";
    assert_eq!(law(lines, 0, "R0"), Some(Law::Short));
    assert_eq!(law(lines, 0, "L1"), Some(Law::Short));
    assert_eq!(law(lines, 0, "C1"), None);
    assert_eq!(law(lines, 0, "T1"), Some(Law::Unknown));
    assert!(matches!(law(lines, 0, "F1"), Some(Law::CurrentControlled(gain, _)) if gain == 2.0));
    assert!(matches!(law(lines, 0, "E1"), Some(Law::VoltageControlled(gain, _)) if gain == 3.0));
    let broken = "V1 a 0 5\nF1 0 a VX 2\nR1 a 0 1k";
    assert_eq!(law(broken, 0, "F1"), Some(Law::Unknown));
}
