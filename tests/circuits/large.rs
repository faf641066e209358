//! Large networks for benches and for the figures in the notes: grids, ladders, sparse random nets, many small ones.

use super::decimal::Dec;
use super::seed::Seed;
use super::{Circuit, Kind};

/// A square grid of resistors, a diode at every second node to one of two rails, and sources along two edges.
/// `grid(300)` has 90,000 nodes and 45,000 diodes.
pub fn grid(side: usize) -> Circuit {
    let mut dice = Seed(1);
    let mut circuit = Circuit::with_nodes(format!("grid of {side} by {side}"), side * side);
    let at = |row: usize, column: usize| row * side + column + 1;
    for row in 0..side {
        for column in 0..side {
            if column + 1 < side {
                circuit.r(at(row, column), at(row, column + 1), *dice.pick(&[100, 220, 470, 1000]));
            }
            if row + 1 < side {
                circuit.r(at(row, column), at(row + 1, column), *dice.pick(&[100, 220, 470, 1000]));
            }
        }
    }
    let (high, low) = (circuit.node(), circuit.node());
    circuit.v(high, 0, 3);
    circuit.v(low, 0, -3);
    for row in 0..side {
        for column in (row % 2..side).step_by(2) {
            let held = row % 20 == 0 && (column == 0 || column + 1 == side);
            if held {
                continue;
            }
            let drop = Dec::milli(*dice.pick(&[300, 600, 700, 1800]));
            if dice.chance(50) {
                circuit.d(at(row, column), high, drop);
            } else {
                circuit.d(low, at(row, column), drop);
            }
        }
    }
    for place in (0..side).step_by(20) {
        let volts = *dice.pick(&[12, 9, 24, 5]);
        circuit.v(at(place, 0), 0, volts);
        circuit.v(at(place, side - 1), 0, -volts);
    }
    circuit
}

/// A ladder: along it resistors and now and then a forward diode, down from each step a diode and a resistor.
pub fn ladder(sections: usize) -> Circuit {
    let mut dice = Seed(2);
    let mut circuit = Circuit::with_nodes(format!("ladder of {sections} sections"), sections + 1);
    circuit.v(1, 0, 100);
    for section in 1..=sections {
        circuit.r(section, section + 1, *dice.pick(&[1, 2, 5, 10]));
        let drop = Dec::milli(*dice.pick(&[300, 600, 700]));
        if dice.chance(50) {
            circuit.d(section + 1, 0, drop);
        } else {
            circuit.d(0, section + 1, drop);
        }
        if dice.chance(30) {
            circuit.r(section + 1, 0, *dice.pick(&[100_000, 1_000_000]));
        }
        if dice.chance(2) {
            let milliamperes = *dice.pick(&[1, -1, 2, -3]);
            circuit.i(0, section + 1, Dec::milli(milliamperes));
        }
    }
    circuit
}

/// A connected random network: `nodes` nodes of four resistors each on average, and diodes anywhere.
pub fn sparse(nodes: usize, diodes: usize) -> Circuit {
    let mut dice = Seed(3);
    let mut circuit = Circuit::with_nodes(format!("random network of {nodes} nodes"), nodes);
    for node in 2..=nodes {
        let other = dice.between(1, node - 1);
        circuit.r(node, other, *dice.pick(&[100, 330, 1000, 4700]));
    }
    for _ in 0..nodes {
        let (from, to) = two(&mut dice, nodes);
        circuit.r(from, to, *dice.pick(&[100, 330, 1000, 4700]));
    }
    for _ in 0..nodes / 200 {
        let node = dice.between(1, nodes);
        let already = circuit.elements.iter().rev().take(nodes / 200);
        if already.filter(|e| matches!(e.kind, Kind::V(_))).all(|e| e.from != node) {
            circuit.v(node, 0, *dice.pick(&[5, -5, 12, -12, 24]));
        }
    }
    for _ in 0..diodes {
        let (from, to) = two(&mut dice, nodes);
        circuit.diode(
            from,
            to,
            super::Diode {
                drop: Dec::milli(*dice.pick(&[300, 600, 700, 1800])),
                breakdown: dice.chance(20).then_some(Dec::milli(5100)),
                series: Dec::from(*dice.pick(&[1, 5, 10])),
            },
        );
    }
    circuit
}

fn two(dice: &mut Seed, nodes: usize) -> (usize, usize) {
    let from = dice.between(1, nodes);
    let other = dice.between(1, nodes - 1);
    (from, if other >= from { other + 1 } else { other })
}

/// Independent circuits of ten diodes each, in one file.
pub fn many_small(count: usize) -> Circuit {
    let mut dice = Seed(4);
    let mut circuit = Circuit::with_nodes(format!("{count} circuits of ten diodes"), 0);
    for _ in 0..count {
        small(&mut circuit, &mut dice, 10, 12);
    }
    circuit
}

/// One source, a resistor tree over its nodes, diodes across it.
fn small(circuit: &mut Circuit, dice: &mut Seed, diodes: usize, resistors: usize) {
    let supply = circuit.node();
    circuit.v(supply, 0, *dice.pick(&[5, 12, -9, 24]));
    let mut nodes = vec![0, supply];
    for _ in 0..resistors {
        let other = *dice.pick(&nodes);
        let node = circuit.node();
        nodes.push(node);
        circuit.r(node, other, *dice.pick(&[100, 330, 1000, 4700, 10_000]));
    }
    for _ in 0..diodes {
        let from = dice.between(2, nodes.len() - 1);
        let to = dice.below(nodes.len() - 1);
        let to = if to >= from { to + 1 } else { to };
        let ends = if dice.chance(50) { (from, to) } else { (to, from) };
        let drop = Dec::milli(*dice.pick(&[300, 600, 700, 1800]));
        let diode = super::Diode { drop, breakdown: None, series: Dec::from(1) };
        circuit.diode(nodes[ends.0], nodes[ends.1], diode);
    }
}

/// A board of that many elements, one in ten a diode, in blocks that share a supply and a bus.
pub fn board(elements: usize) -> Circuit {
    let mut dice = Seed(5);
    let mut circuit = Circuit::with_nodes(format!("board of {elements} elements"), 2);
    let (supply, bus) = (1, 2);
    circuit.v(supply, 0, 12);
    circuit.r(bus, 0, 10_000);
    while circuit.elements.len() < elements {
        let block = 40.min(elements - circuit.elements.len());
        board_block(&mut circuit, &mut dice, block, supply, bus);
    }
    circuit
}

/// `size` elements: a chain of resistors from the supply, a diode at every tenth, capacitors to ground, the end to
/// the bus.
fn board_block(circuit: &mut Circuit, dice: &mut Seed, size: usize, supply: usize, bus: usize) {
    let mut node = supply;
    for number in 0..size {
        match number % 10 {
            // towards the bus, ground or the supply, never straight across a source
            9 if node != supply => {
                let drop = Dec::milli(*dice.pick(&[300, 600, 700, 1800]));
                match dice.below(3) {
                    0 => circuit.d(node, bus, drop),
                    1 => circuit.d(node, 0, drop),
                    _ => circuit.d(node, supply, drop),
                };
            }
            4 if node != supply => {
                circuit.add(node, 0, Kind::C);
            }
            7 if node != supply => {
                circuit.r(node, 0, *dice.pick(&[4700, 10_000, 47_000]));
            }
            _ => {
                let next = circuit.node();
                circuit.r(node, next, *dice.pick(&[100, 330, 1000, 4700]));
                node = next;
            }
        }
    }
    // the last element of a block is a diode or a resistor whose far end must not hang loose
    if size == 40 {
        let last = circuit.elements.len() - 1;
        if matches!(circuit.elements[last].kind, Kind::R(_)) {
            circuit.elements[last].to = bus;
        }
    }
}
