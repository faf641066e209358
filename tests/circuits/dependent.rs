//! Random networks with dependent sources (E F G H) and negative resistances, where more than one consistent set of
//! states may exist. Gains and resistances are taken so that most sets are isolated points.

use super::decimal::Dec;
use super::seed::Seed;
use super::{Circuit, Diode, Kind};

const OHMS: &[i64] = &[330, 470, 1000, 1500, 2200, 3300, 4700, 6800, 10_000];
const GAINS: &[i64] = &[-20, -30, 15, 25, 50, -7, 5, -100, 30];
const DROPS: &[i64] = &[700, 620, 310, 1150];

/// The network of a seed.
pub fn network(seed: u64) -> Circuit {
    let mut dice = Seed(seed ^ 0xD1FF_0E4E);
    let nodes = dice.between(2, 6);
    let mut circuit = Circuit::with_nodes(format!("random network {seed}, with dependent parts"), nodes);
    for node in 1..=nodes {
        let other = dice.below(node);
        circuit.r(node, other, *dice.pick(OHMS));
    }
    for _ in 0..dice.between(1, 4) {
        let (from, to) = ends(&mut dice, nodes);
        circuit.r(from, to, *dice.pick(OHMS));
    }
    let source = dice.between(1, nodes);
    circuit.v(source, 0, Dec::new(*dice.pick(&[5, 12, -3, 24]), 0));
    if dice.chance(40) {
        let (from, to) = ends(&mut dice, nodes);
        circuit.i(from, to, Dec::new(*dice.pick(&[7, 13, -9]), -4));
    }
    for _ in 0..dice.between(1, 3) {
        active(&mut dice, &mut circuit);
    }
    for _ in 0..dice.between(2, 6) {
        let (from, to) = ends(&mut dice, nodes);
        let drop = Dec::milli(*dice.pick(DROPS));
        let breakdown = dice.chance(35).then(|| Dec::milli(*dice.pick(&[2700, 5100, 3300])));
        let series = if dice.chance(60) { Dec::from(22) } else { Dec::ZERO };
        circuit.diode(from, to, Diode { drop, breakdown, series });
    }
    dice.shuffle(&mut circuit.elements);
    circuit.compact();
    circuit
}

fn ends(dice: &mut Seed, nodes: usize) -> (usize, usize) {
    let from = dice.below(nodes + 1);
    let step = dice.between(1, nodes);
    (from, (from + step) % (nodes + 1))
}

/// A dependent source, or a negative resistance.
fn active(dice: &mut Seed, circuit: &mut Circuit) {
    let nodes = circuit.nodes.len() - 1;
    let (from, to) = ends(dice, nodes);
    let control = ends(dice, nodes);
    let gain = *dice.pick(GAINS);
    let sense = circuit.elements.iter().find(|e| matches!(e.kind, Kind::V(_))).map(|e| e.name.clone());
    let sense = sense.unwrap_or_default();
    match dice.below(9) {
        0 => circuit.add(from, to, Kind::E { gain: Dec::new(gain, -1), control }),
        1 => circuit.add(from, to, Kind::G { gain: Dec::new(gain, -4), control }),
        2 => circuit.add(from, to, Kind::F { gain: Dec::new(gain, -1), control: sense }),
        3 => circuit.add(from, to, Kind::H { gain: Dec::new(gain, 2), control: sense }),
        _ => circuit.r(from, to, -*dice.pick(OHMS)),
    };
}
