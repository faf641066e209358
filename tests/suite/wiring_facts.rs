//! Facts of the wiring against plain searches written independently here, on seeded random circuits, and on
//! circuits so long that a recursion would run out of stack.

use kneewise::circuit::{self, Circuit, ElementId};
use kneewise::config::Options;
use kneewise::text::Memory;
use kneewise::topology::{Sum, Wiring};
use std::fmt::Write as _;
use std::path::Path;

fn read(text: &str) -> Circuit {
    let mut files = Memory::with("t.cir", text);
    circuit::read(&mut files, Path::new("t.cir"), &Options::default()).unwrap().circuit
}

/// A small generator of numbers that is the same everywhere (xorshift, Marsaglia 2003).
struct Dice(u64);

impl Dice {
    fn roll(&mut self, sides: u64) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0 % sides
    }
}

/// One element of the independent description: letter, first node, second node.
type Line = (char, u64, u64);

fn random_lines(dice: &mut Dice) -> Vec<Line> {
    let nodes = 2 + dice.roll(7);
    let letters = ['D', 'D', 'D', 'D', 'Z', 'R', 'C', 'V', 'I', 'L'];
    let count = 2 + dice.roll(12);
    (0..count)
        .map(|_| (letters[dice.roll(letters.len() as u64) as usize], dice.roll(nodes), dice.roll(nodes)))
        .collect()
}

fn netlist(lines: &[Line]) -> String {
    // DZ breaks down at whatever voltage there is; a greater BV than all sources together is none
    let mut text = String::from("random buoy circuit\n.model DP D(IS=1n)\n.model DZ D(BV=0)\n");
    for (n, &(letter, a, b)) in lines.iter().enumerate() {
        let (name, value) = match letter {
            'D' => (format!("D{n}"), "DP"),
            'Z' => (format!("D{n}"), "DZ"),
            other => (format!("{other}{n}"), "1"),
        };
        let _ = writeln!(text, "{name} {a} {b} {value}");
    }
    text
}

/// Nodes reached from `from` along `arcs` without using line `but`.
fn reached(lines: &[Line], from: u64, but: usize, arcs: impl Fn(char) -> (bool, bool)) -> Vec<u64> {
    let mut seen = vec![from];
    let mut at = 0;
    while at < seen.len() {
        let here = seen[at];
        at += 1;
        for (n, &(letter, a, b)) in lines.iter().enumerate() {
            let (forth, back) = arcs(letter);
            for (x, y, allowed) in [(a, b, forth), (b, a, back)] {
                if n != but && allowed && x == here && !seen.contains(&y) {
                    seen.push(y);
                }
            }
        }
    }
    seen
}

fn number(circuit: &Circuit, id: ElementId) -> usize {
    circuit.element_name(id)[1..].parse().unwrap()
}

#[test]
fn barred_diodes_are_those_without_a_way_back() {
    let mut dice = Dice(0x7EA5);
    let (mut barred, mut free, mut bridges) = (0, 0, 0);
    for _ in 0..3000 {
        let lines = random_lines(&mut dice);
        let circuit = read(&netlist(&lines));
        let wiring = Wiring::of(&circuit);
        let found: Vec<usize> = wiring.one_way.barred.iter().map(|b| number(&circuit, b.diode)).collect();
        for (n, &(letter, anode, cathode)) in lines.iter().enumerate().filter(|(_, l)| l.0 == 'D') {
            let way_back = reached(&lines, cathode, usize::MAX, |l| (true, l != 'D'));
            assert_eq!(found.contains(&n), !way_back.contains(&anode), "{letter}{n} in {lines:?}");
            if let Some(b) = wiring.one_way.barred.iter().find(|b| number(&circuit, b.diode) == n) {
                let joined = reached(&lines, cathode, n, |_| (true, true)).contains(&anode);
                assert_eq!(b.dead_end, !joined, "D{n} in {lines:?}");
                bridges += usize::from(b.dead_end);
                barred += 1;
            } else {
                free += 1;
            }
        }
    }
    // the sample holds every kind
    assert!(barred > 500 && free > 500 && bridges > 100, "{barred} {free} {bridges}");
}

#[test]
fn held_nodes_are_those_that_direct_current_reaches_from_ground() {
    let mut dice = Dice(0xB0A7);
    for _ in 0..2000 {
        let lines = random_lines(&mut dice);
        let circuit = read(&netlist(&lines));
        let wiring = Wiring::of(&circuit);
        let direct = |l: char| (!"CI".contains(l), !"CI".contains(l));
        let from_ground = reached(&lines, 0, usize::MAX, direct);
        let on_island = reached(&lines, 0, usize::MAX, |_| (true, true));
        for n in 0..circuit.nodes.len() {
            let node = kneewise::circuit::NodeId(n as u32);
            let name: u64 = circuit.node_name(node).parse().unwrap();
            assert_eq!(wiring.held.of(node) == 0, from_ground.contains(&name), "{name} in {lines:?}");
            assert_eq!(wiring.islands.of(node) == 0, on_island.contains(&name), "{name} in {lines:?}");
        }
    }
}

#[test]
fn loops_sum_written_numbers_exactly() {
    // 0.7 V three times is 2.1 V in writing, though not in binary
    let wiring = Wiring::of(&read("t\nV1 a 0 0.7\nV2 b a 0.7\nV3 c b 0.7\nV4 c 0 2.1\n"));
    assert_eq!(wiring.loops.len(), 1);
    assert_eq!((wiring.loops[0].sum, wiring.loops[0].steps.len()), (Sum::Zero, 4));
    let wiring = Wiring::of(&read("t\nV1 a 0 5\nV2 0 a 5\nL1 a 0 1m\nR1 a 0 0\n"));
    let sums: Vec<Sum> = wiring.loops.iter().map(|l| l.sum).collect();
    assert_eq!(sums.len(), 3);
    assert!(matches!(sums[0], Sum::Volts(v) if v.abs() == 10.0), "{sums:?}");
    assert!(Wiring::of(&read("t\nL1 a 0 1m\nL2 a 0 1m\nR1 a 0 0\nV1 b 0 1\nR2 a b 1\n")).loops.is_empty());
}

#[test]
fn long_chains_need_no_deep_stack() {
    let mut text = String::from("chain\n.model DP D(IS=1n)\nV1 n0 0 5\n");
    let count = 60_000;
    for n in 0..count {
        let kind = ["D", "L", "V", "C"][n % 4];
        let value = ["DP", "1m", "1", "1u"][n % 4];
        let _ = writeln!(text, "{kind}x{n} n{n} n{} {value}", n + 1);
    }
    let _ = writeln!(text, "R1 n{count} 0 1k");
    let circuit = read(&text);
    // a thread's stack far smaller than the chain is long
    let small = std::thread::Builder::new().stack_size(256 * 1024);
    let wiring = std::thread::scope(|scope| {
        small.spawn_scoped(scope, || Wiring::of(&circuit)).unwrap().join().unwrap()
    });
    assert!(wiring.one_way.barred.is_empty() && wiring.loops.is_empty());
    assert!(wiring.held.count() > 10_000);
}
