//! Which single source changes a state: by hand from the constant-drop model.

use super::told;
use crate::circuit::State;
use crate::complementarity::{Branch, Junction, Law, Level, Network, Place};
use crate::operating::flip::{Way, follow};

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

/// Seeded numbers (SplitMix64: Steele, Lea & Flood 2014).
struct Seed(u64);

impl Seed {
    fn below(&mut self, limit: u64) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        (z ^ (z >> 31)) % limit
    }
}

/// Two sources, a mesh of resistors (so that all is determined), and a few diodes; the first diode is branch 2.
fn random_network(seed: &mut Seed) -> Network {
    let nodes = 5;
    let exact = |value| Level { value, exact: true };
    let mut branches = vec![
        Branch { from: 1, to: 0, law: Law::Voltage(exact(1.0 + seed.below(10) as f64)) },
        Branch { from: 2, to: 0, law: Law::Voltage(exact(1.0 + seed.below(10) as f64)) },
    ];
    for _ in 0..4 {
        let (from, to) = (seed.below(nodes) as u32, seed.below(nodes) as u32);
        let reverse = (seed.below(2) == 0).then(|| exact(2.0 + seed.below(6) as f64));
        let junction = Junction { forward: exact(0.7), reverse, series: 10.0 + seed.below(90) as f64 };
        let to = if from == to { (to + 1) % nodes as u32 } else { to };
        branches.push(Branch { from, to, law: Law::Junction(junction) });
    }
    for node in 1..nodes as u32 {
        for other in 0..node {
            let ohms = 100.0 * (1.0 + seed.below(50) as f64);
            branches.push(Branch { from: node, to: other, law: Law::Resistance(ohms) });
        }
    }
    Network { nodes: nodes as u32, branches }
}

fn place(network: &Network, source: usize, volts: f64) -> Place {
    let mut network = network.clone();
    network.branches[source].law = Law::Voltage(Level { value: volts, exact: false });
    network.solve().solutions[0].places[2]
}

#[test]
fn what_is_found_agrees_with_solving_at_many_values() {
    let mut seed = Seed(7);
    let mut changes = 0;
    for trial in 0..30 {
        let network = random_network(&mut seed);
        let Law::Voltage(Level { value: from, .. }) = network.branches[0].law else { continue };
        let start = place(&network, 0, from);
        for limit in [10.0 * from, -10.0 * from] {
            let way = follow(&network, 2, 0, from, limit, 10_000);
            let end = match way {
                Way::Never => limit,
                Way::Changes { at, place: beyond, nearest } => {
                    assert!(nearest);
                    changes += 1;
                    let aside = 1e-6 * (limit - from);
                    assert_eq!(place(&network, 0, at - aside), start, "trial {trial}: before {at}");
                    assert_eq!(place(&network, 0, at + aside), beyond, "trial {trial}: beyond {at}");
                    at
                }
                Way::Lost => f64::NAN,
            };
            assert!(end.is_finite(), "trial {trial}: lost");
            for step in 0..50 {
                let volts = from + (end - from) * f64::from(step) / 50.0;
                assert_eq!(place(&network, 0, volts), start, "trial {trial}: at {volts}, {way:?}");
            }
        }
    }
    assert!(changes > 20, "{changes} changes are too few to mean anything");
}

#[test]
fn with_few_solves_some_change_is_found_all_the_same() {
    // a ladder whose diodes start to conduct one after the other
    let exact = |value| Level { value, exact: true };
    let mut branches = vec![Branch { from: 1, to: 0, law: Law::Voltage(exact(0.5)) }];
    for n in 1..200 {
        let forward = exact(0.7 + 0.05 * f64::from(n));
        let junction = Junction { forward, reverse: None, series: 1e3 };
        branches.push(Branch { from: n + 1, to: 0, law: Law::Junction(junction) });
        branches.push(Branch { from: n, to: n + 1, law: Law::Resistance(10.0) });
    }
    let network = Network { nodes: 201, branches };
    let far = 21; // the diode at node 12
    let Way::Changes { at: exactly, nearest: true, .. } = follow(&network, far, 0, 0.5, 5.0, 100_000) else {
        unreachable!("a change is there")
    };
    let Way::Changes { at, nearest: false, .. } = follow(&network, far, 0, 0.5, 5.0, 60) else {
        unreachable!("the solves are too few to walk")
    };
    assert!((at - exactly).abs() < 1e-6, "{at} is not {exactly}");
}
