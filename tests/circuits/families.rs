//! Families of networks that are known to be hard on solvers: ladders, nested bridges, trees of gates, multipliers at
//! rest, rings, grids, equal drops, near-ties, wide spreads.

use super::decimal::Dec;
use super::seed::Seed;
use super::{Circuit, Diode};

/// Resistors along, diodes down, alternately one way and the other, currents pushed in here and there.
pub fn ladder(sections: usize, seed: u64) -> Circuit {
    let mut dice = Seed(seed);
    let mut circuit = Circuit::with_nodes(format!("ladder of {sections}, {seed}"), sections + 1);
    circuit.v(1, 0, *dice.pick(&[10, -10, 24]));
    for section in 1..=sections {
        circuit.r(section, section + 1, *dice.pick(&[1, 10, 33, 100]));
        let drop = Dec::milli(*dice.pick(&[300, 600, 700, 2000]));
        match section % 3 {
            0 => circuit.d(section + 1, 0, drop),
            1 => circuit.d(0, section + 1, drop),
            _ => circuit.d(section, section + 1, drop),
        };
        circuit.r(section + 1, 0, *dice.pick(&[470, 1000, 10_000]));
        if dice.chance(25) {
            circuit.i(0, section + 1, Dec::milli(*dice.pick(&[5, -8, 40])));
        }
    }
    circuit
}

/// A bridge of four diodes whose load is a resistor and the next bridge, `depth` times.
pub fn bridges(depth: usize, volts: i64, drops: &[i64]) -> Circuit {
    let mut circuit = Circuit::with_nodes(format!("{depth} bridges, one in the other"), 1);
    circuit.v(1, 0, volts);
    let (mut high, mut low) = (1, 0);
    for level in 0..depth {
        let (plus, minus, next) = (circuit.node(), circuit.node(), circuit.node());
        let drop = Dec::milli(drops[level % drops.len()]);
        circuit.d(high, plus, drop);
        circuit.d(low, plus, drop);
        circuit.d(minus, high, drop);
        circuit.d(minus, low, drop);
        circuit.r(plus, next, 100);
        circuit.r(plus, minus, 2200);
        // the next bridge is fed the wrong way round every other time
        (high, low) = if level % 2 == 0 { (next, minus) } else { (minus, next) };
    }
    circuit.r(high, low, 330);
    circuit
}

/// A tree of diode gates, AND and OR by turns, over 2^depth inputs of 0 or 5 V, every drop a little different.
pub fn gates(depth: usize, seed: u64) -> Circuit {
    let mut dice = Seed(seed);
    let inputs = 1usize << depth;
    let mut circuit = Circuit::with_nodes(format!("gates over {inputs} inputs, {seed}"), inputs + 1);
    let supply = inputs + 1;
    circuit.v(supply, 0, 5);
    for input in 1..=inputs {
        let volts = if dice.chance(50) { 5 } else { 0 };
        circuit.v(input, 0, volts);
    }
    let mut signals: Vec<usize> = (1..=inputs).collect();
    let mut number = 0;
    for level in 0..depth {
        let mut outputs = Vec::new();
        for pair in signals.chunks(2) {
            let output = circuit.node();
            outputs.push(output);
            let both_ways = level % 2 == 0;
            // each level's pull is weaker than the one before by ten
            let ohms = 1000 * 10i64.pow(u32::try_from(level).unwrap_or(0));
            circuit.r(output, if both_ways { supply } else { 0 }, ohms);
            for &signal in pair {
                number += 1;
                let drop = Dec::new(6000 + number * 7, -4);
                if both_ways {
                    circuit.d(output, signal, drop)
                } else {
                    circuit.d(signal, output, drop)
                };
            }
        }
        signals = outputs;
    }
    circuit
}

/// A voltage multiplier at rest: its capacitors are open, the diodes stand in one chain.
pub fn multiplier(stages: usize, load: bool) -> Circuit {
    let mut circuit = Circuit::with_nodes(format!("multiplier of {stages} stages at rest"), 1);
    circuit.v(1, 0, 9);
    let (mut pump, mut hold) = (1, 0);
    let mut last = 1;
    for _ in 0..stages {
        let (up, out) = (circuit.node(), circuit.node());
        circuit.add(pump, up, super::Kind::C);
        circuit.d(last, up, Dec::milli(200));
        circuit.add(hold, out, super::Kind::C);
        circuit.d(up, out, Dec::milli(200));
        (pump, hold, last) = (up, out, out);
    }
    if load {
        circuit.r(last, 0, 10_000);
    }
    circuit
}

/// A ring of diodes all the same way round, a resistor to ground and a current at each node.
pub fn ring(size: usize, seed: u64) -> Circuit {
    let mut dice = Seed(seed);
    let mut circuit = Circuit::with_nodes(format!("ring of {size}, {seed}"), size);
    for node in 1..=size {
        let next = node % size + 1;
        circuit.d(node, next, Dec::milli(*dice.pick(&[0, 10, 300, 700])));
        circuit.r(node, 0, *dice.pick(&[100, 1000, 2200]));
        circuit.i(0, node, Dec::milli(*dice.pick(&[1, -2, 5, -7, 13])));
    }
    circuit
}

/// A grid of diodes with random drops and directions, sources at two corners, a resistor to ground at each node.
pub fn grid(side: usize, seed: u64) -> Circuit {
    let mut dice = Seed(seed);
    let mut circuit =
        Circuit::with_nodes(format!("grid of diodes {side} by {side}, {seed}"), side * side + 2);
    let at = |row: usize, column: usize| row * side + column + 1;
    let (high, low) = (side * side + 1, side * side + 2);
    circuit.v(high, 0, 30);
    circuit.v(low, 0, -30);
    circuit.r(high, at(0, 0), 10);
    circuit.r(low, at(side - 1, side - 1), 10);
    for row in 0..side {
        for column in 0..side {
            circuit.r(at(row, column), 0, 1000);
            let mut joins = Vec::new();
            if column + 1 < side {
                joins.push(at(row, column + 1));
            }
            if row + 1 < side {
                joins.push(at(row + 1, column));
            }
            for other in joins {
                let drop = Dec::milli(i64::try_from(dice.between(100, 1900)).unwrap_or(700));
                let ends = if dice.chance(70) { (at(row, column), other) } else { (other, at(row, column)) };
                circuit.d(ends.0, ends.1, drop);
            }
        }
    }
    circuit
}

/// A network whose values span many decades: milliohms to teraohms, microvolts to kilovolts, nanoamperes to
/// kiloamperes.
pub fn wide(seed: u64) -> Circuit {
    let mut dice = Seed(seed ^ 0x31DE);
    let nodes = dice.between(2, 6);
    let mut circuit = Circuit::with_nodes(format!("wide spread, {seed}"), nodes);
    for node in 1..=nodes {
        let other = dice.below(node);
        circuit.r(node, other, spread(&mut dice, -3, 12));
    }
    for _ in 0..dice.between(1, 4) {
        let (from, to) = two(&mut dice, nodes);
        circuit.r(from, to, spread(&mut dice, -3, 12));
    }
    let source = dice.between(1, nodes);
    circuit.v(source, 0, spread(&mut dice, -3, 3));
    for _ in 0..dice.below(3) {
        let (from, to) = two(&mut dice, nodes);
        circuit.i(from, to, spread(&mut dice, -9, 2));
    }
    for _ in 0..dice.between(1, 5) {
        let (from, to) = two(&mut dice, nodes);
        let drop = Dec::milli(*dice.pick(&[200, 330, 700, 1850]));
        let breakdown = dice.chance(40).then(|| spread(&mut dice, 0, 2));
        let series = if dice.chance(50) { spread(&mut dice, -3, 1) } else { Dec::ZERO };
        circuit.diode(from, to, Diode { drop, breakdown, series });
    }
    circuit
}

fn two(dice: &mut Seed, nodes: usize) -> (usize, usize) {
    let from = dice.below(nodes + 1);
    let step = dice.between(1, nodes);
    (from, (from + step) % (nodes + 1))
}

/// A number of two digits at a power of ten from `low` to `high`.
fn spread(dice: &mut Seed, low: i32, high: i32) -> Dec {
    let digits = i64::try_from(dice.between(10, 99)).unwrap_or(10);
    let power = low + i32::try_from(dice.below((high - low + 1).unsigned_abs() as usize)).unwrap_or(0);
    Dec::new(digits, power - 1)
}
