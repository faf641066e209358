//! Random networks of R, V, I, D (and an open C or a short L now and then), every value from a coarse grid, so
//! that ties, loops of no resistance, floating parts and contradictions occur often.

use super::decimal::Dec;
use super::seed::Seed;
use super::{Circuit, Diode, Kind};

/// What a random network is made of.
struct Style {
    name: &'static str,
    nodes: (usize, usize),
    diodes: (usize, usize),
    resistors: (usize, usize),
    voltages: (usize, usize),
    currents: (usize, usize),
    /// Drops in millivolts.
    drops: &'static [i64],
    /// Voltages in millivolts.
    volts: &'static [i64],
    /// Currents in tenths of a milliampere.
    amperes: &'static [i64],
    /// Percent of diodes with breakdown, and its grid in millivolts.
    breakdown: usize,
    levels: &'static [i64],
    /// Percent of diodes with a series resistance.
    series: usize,
    /// Percent of voltage sources from a node to ground.
    grounded: usize,
    /// Percent of networks whose sources may close loops of their own.
    source_loops: usize,
    /// Percent of networks that are joined together by resistors.
    joined: usize,
    /// Percent of diodes that stand beside the one before, same way round or the other way.
    twins: usize,
}

const OHMS: &[i64] = &[100, 200, 500, 1000, 1000, 2000, 3000, 4700, 10_000];

const STYLES: &[Style] = &[
    Style {
        name: "mixed",
        nodes: (2, 6),
        diodes: (1, 5),
        resistors: (2, 6),
        voltages: (1, 3),
        currents: (0, 1),
        drops: &[700, 700, 600, 300, 0],
        volts: &[0, 500, 700, 1400, 2000, 3000, 5000, -2000, -5000, 12_000],
        amperes: &[0, 10, 20, -10, 5, -7],
        breakdown: 30,
        levels: &[700, 1000, 2000, 5100],
        series: 25,
        grounded: 75,
        source_loops: 2,
        joined: 85,
        twins: 12,
    },
    Style {
        name: "ties",
        nodes: (2, 5),
        diodes: (2, 6),
        resistors: (0, 3),
        voltages: (1, 3),
        currents: (0, 1),
        drops: &[700, 700, 1400, 300],
        volts: &[0, 700, 1400, 700, 300, 1000, 2100, -700],
        amperes: &[0, 10, -10],
        breakdown: 20,
        levels: &[700, 1400, 2100],
        series: 15,
        grounded: 75,
        source_loops: 10,
        joined: 40,
        twins: 25,
    },
    Style {
        name: "fed by currents",
        nodes: (2, 6),
        diodes: (2, 6),
        resistors: (0, 4),
        voltages: (0, 1),
        currents: (1, 3),
        drops: &[700, 700, 300, 0],
        volts: &[0, 700, 5000, -2000],
        amperes: &[10, 10, 20, -10, -20, 0],
        breakdown: 35,
        levels: &[700, 2000, 5100],
        series: 20,
        grounded: 80,
        source_loops: 10,
        joined: 55,
        twins: 25,
    },
    Style {
        name: "ideal diodes",
        nodes: (2, 6),
        diodes: (2, 6),
        resistors: (1, 5),
        voltages: (1, 3),
        currents: (0, 1),
        drops: &[0],
        volts: &[0, 1000, 1000, 2000, -1000, 5000],
        amperes: &[0, 10, -10, 20],
        breakdown: 10,
        levels: &[1000, 2000],
        series: 10,
        grounded: 80,
        source_loops: 5,
        joined: 70,
        twins: 25,
    },
    Style {
        name: "loose",
        nodes: (3, 8),
        diodes: (1, 6),
        resistors: (0, 4),
        voltages: (1, 2),
        currents: (0, 2),
        drops: &[700, 300, 0],
        volts: &[700, 1400, 5000, -5000, 0],
        amperes: &[0, 0, 10, -10],
        breakdown: 20,
        levels: &[700, 2000, 5000],
        series: 20,
        grounded: 60,
        source_loops: 5,
        joined: 0,
        twins: 25,
    },
    Style {
        name: "islands",
        nodes: (2, 5),
        diodes: (1, 3),
        resistors: (0, 2),
        voltages: (0, 2),
        currents: (1, 2),
        drops: &[700, 700, 0],
        volts: &[700, 1400, 0],
        amperes: &[10, 20, -10],
        breakdown: 20,
        levels: &[700, 1400],
        series: 8,
        grounded: 25,
        source_loops: 20,
        joined: 0,
        twins: 50,
    },
    Style {
        name: "larger",
        nodes: (5, 8),
        diodes: (5, 7),
        resistors: (6, 10),
        voltages: (1, 3),
        currents: (0, 1),
        drops: &[700, 600, 300, 2000],
        volts: &[0, 700, 2000, 3000, 5000, -5000, 12_000],
        amperes: &[10, 20, -10],
        breakdown: 40,
        levels: &[700, 2700, 5100],
        series: 30,
        grounded: 80,
        source_loops: 0,
        joined: 95,
        twins: 12,
    },
];

/// The network of a seed.
pub fn network(seed: u64) -> Circuit {
    let mut dice = Seed(seed);
    let style = &STYLES[dice.below(STYLES.len())];
    let nodes = dice.between(style.nodes.0, style.nodes.1);
    let mut circuit = Circuit::with_nodes(format!("random network {seed}, {}", style.name), nodes);
    let mut maker =
        Maker { loops: dice.chance(style.source_loops), dice, style, tree: (0..=nodes).collect() };
    maker.sources(&mut circuit);
    maker.resistors(&mut circuit);
    maker.diodes(&mut circuit);
    if style.name == "islands" && maker.dice.chance(65) {
        maker.island(&mut circuit);
    }
    maker.trimmings(&mut circuit);
    maker.dice.shuffle(&mut circuit.elements);
    circuit.compact();
    circuit
}

struct Maker {
    dice: Seed,
    style: &'static Style,
    loops: bool,
    /// Which nodes sources join, by a representative.
    tree: Vec<usize>,
}

impl Maker {
    fn count(&mut self, range: (usize, usize)) -> usize {
        self.dice.between(range.0, range.1)
    }

    fn milli(&mut self, grid: &[i64]) -> Dec {
        Dec::milli(*self.dice.pick(grid))
    }

    /// Two nodes, hardly ever the same.
    fn ends(&mut self, circuit: &Circuit) -> (usize, usize) {
        let nodes = circuit.nodes.len();
        let from = self.dice.below(nodes);
        let mut to = self.dice.below(nodes);
        while to == from && !self.dice.chance(2) {
            to = self.dice.below(nodes);
        }
        (from, to)
    }

    fn root(&self, mut node: usize) -> usize {
        while self.tree[node] != node {
            node = self.tree[node];
        }
        node
    }

    fn sources(&mut self, circuit: &mut Circuit) {
        for _ in 0..self.count(self.style.voltages) {
            let (from, mut to) = self.ends(circuit);
            if self.dice.chance(self.style.grounded) {
                to = 0;
            }
            let (a, b) = (self.root(from), self.root(to));
            if a == b && !self.loops {
                continue;
            }
            self.tree[a] = b;
            let volts = self.milli(self.style.volts);
            circuit.v(from, to, volts);
        }
        for _ in 0..self.count(self.style.currents) {
            let (from, to) = self.ends(circuit);
            let amperes = Dec::new(*self.dice.pick(self.style.amperes), -4);
            circuit.i(from, to, amperes);
        }
    }

    fn resistors(&mut self, circuit: &mut Circuit) {
        if self.dice.chance(self.style.joined) {
            for node in 1..circuit.nodes.len() {
                let other = self.dice.below(node);
                let ohms = *self.dice.pick(OHMS);
                circuit.r(node, other, ohms);
            }
        }
        for _ in 0..self.count(self.style.resistors) {
            let (from, to) = self.ends(circuit);
            let ohms = *self.dice.pick(OHMS);
            circuit.r(from, to, ohms);
        }
    }

    fn diodes(&mut self, circuit: &mut Circuit) {
        let mut last = (0, 0);
        for number in 0..self.count(self.style.diodes) {
            let mut ends = self.ends(circuit);
            if number > 0 && self.dice.chance(self.style.twins) {
                ends = last;
                if self.dice.chance(30) {
                    ends = (last.1, last.0);
                }
            }
            last = ends;
            let drop = self.milli(self.style.drops);
            let breakdown = self.dice.chance(self.style.breakdown).then(|| self.milli(self.style.levels));
            let series = if self.dice.chance(self.style.series) {
                *self.dice.pick(&[Dec::new(10, 0), Dec::new(100, 0), Dec::new(5, -1)])
            } else {
                Dec::ZERO
            };
            circuit.diode(ends.0, ends.1, Diode { drop, breakdown, series });
        }
    }

    /// Two nodes of their own with a current source and equal ways for its current, tied to the rest by at most
    /// two diodes.
    fn island(&mut self, circuit: &mut Circuit) {
        let (high, low) = (circuit.node(), circuit.node());
        let amperes = Dec::new(*self.dice.pick(&[10, 20, 5]), -4);
        circuit.i(low, high, amperes);
        let drop = self.milli(self.style.drops);
        circuit.d(high, low, drop);
        if self.dice.chance(70) {
            circuit.d(high, low, drop);
        } else {
            let middle = circuit.node();
            circuit.d(high, middle, drop);
            circuit.d(middle, low, Dec::ZERO);
        }
        for _ in 0..self.dice.between(0, 2) {
            let inside = *self.dice.pick(&[high, low]);
            let outside = self.dice.below(circuit.nodes.len());
            let drop = self.milli(self.style.drops);
            let ends = if self.dice.chance(50) { (inside, outside) } else { (outside, inside) };
            circuit.d(ends.0, ends.1, drop);
        }
    }

    /// An open capacitor anywhere; a short where it closes no loop of shorts and meets no ideal diode.
    fn trimmings(&mut self, circuit: &mut Circuit) {
        if self.dice.chance(8) {
            let (from, to) = self.ends(circuit);
            circuit.add(from, to, Kind::C);
        }
        let ideal = circuit.diodes().any(|(_, d)| d.drop.is_zero());
        if !ideal && self.dice.chance(8) {
            let (from, to) = self.ends(circuit);
            if from != to {
                let short = if self.dice.chance(50) { Kind::L } else { Kind::R(Dec::ZERO) };
                circuit.add(from, to, short);
            }
        }
    }
}

/// A connected network of that many diodes, values from a finer grid, hardly any ties: for references that find one
/// solution at a time.
pub fn connected(seed: u64, diodes: usize) -> Circuit {
    const FINE_OHMS: &[i64] = &[120, 270, 330, 560, 910, 1200, 1800, 2700, 4300, 6200, 8200, 13_000];
    let mut dice = Seed(seed ^ 0x00C0_FFEE);
    let nodes = diodes / 2 + dice.between(2, diodes / 2 + 2);
    let mut circuit = Circuit::with_nodes(format!("connected network {seed} of {diodes} diodes"), nodes);
    for node in 1..=nodes {
        let other = dice.below(node);
        circuit.r(node, other, *dice.pick(FINE_OHMS));
    }
    for _ in 0..nodes / 2 {
        let (from, to) = apart(&mut dice, nodes);
        circuit.r(from, to, *dice.pick(FINE_OHMS));
    }
    for node in [1, 1 + nodes / 2, nodes] {
        let volts = Dec::new(*dice.pick(&[5, 12, 9, -5, -12, 3, 24]), 0);
        let held = circuit.elements.iter().any(|e| matches!(e.kind, Kind::V(_)) && e.from == node);
        if !held {
            circuit.v(node, 0, volts);
        }
    }
    for _ in 0..dice.between(0, 3) {
        let (from, to) = apart(&mut dice, nodes);
        circuit.i(from, to, Dec::new(*dice.pick(&[3, 11, -17, 23]), -4));
    }
    for _ in 0..diodes {
        let (from, to) = apart(&mut dice, nodes);
        let drop = Dec::milli(*dice.pick(&[310, 590, 640, 700, 1830, 2110]));
        let breakdown = dice.chance(30).then(|| Dec::milli(*dice.pick(&[3300, 5100, 6800])));
        // a little resistance in most keeps contradictions from being the rule
        let series = if dice.chance(85) { Dec::from(*dice.pick(&[2, 7, 15])) } else { Dec::ZERO };
        circuit.diode(from, to, Diode { drop, breakdown, series });
    }
    circuit
}

fn apart(dice: &mut Seed, nodes: usize) -> (usize, usize) {
    let from = dice.below(nodes + 1);
    let step = dice.between(1, nodes);
    (from, (from + step) % (nodes + 1))
}
