//! Theorems about networks of resistors, sources and diodes, held against networks too large to enumerate.

use crate::circuits::decimal::Dec;
use crate::circuits::seed::Seed;
use crate::circuits::{Circuit, Diode, Kind, random};
use crate::run::{self, Named, nominal};
use kneewise::analysis::Analysis;
use kneewise::complementarity::{Quantity, Verdict};

/// Two-terminal elements whose voltage and current never fall against each other have one set of voltages at most
/// (R. J. Duffin, "Nonlinear networks. IIa", Bull. Amer. Math. Soc. 53 (1947) 963–971): where resistors join every
/// node to held ones nothing can float, and there is exactly one or a contradiction.
#[test]
fn passive_networks_have_one_set_of_voltages() {
    for seed in 0..150 {
        let circuit = random::connected(seed, 8 + (seed as usize * 5) % 40);
        let analysis = run::states(&circuit.text());
        let case = nominal(&analysis).unwrap_or_else(|problem| panic!("{problem}\n{}", circuit.text()));
        match case.verdict {
            Verdict::Unique | Verdict::Shared => {
                let solution = &case.solutions[0];
                let open = solution.nodes.iter().filter(|n| n.voltage.known().is_none()).count();
                assert_eq!(open, 0, "{open} voltages are not known\n{}", circuit.text());
            }
            Verdict::None => {}
            other => panic!("{other:?} in {} solves\n{}", case.solves, circuit.text()),
        }
    }
}

/// No-gain property (A. N. Willson Jr., IEEE Trans. Circuits Syst. 22 (1975) 678–687; D. H. Wolaver, IEEE Trans.
/// Circuit Theory 17 (1970) 436–437; titles and pages from memory): where all sources are voltages between a node and
/// ground, every potential lies between the extremes of the held ones.
#[test]
fn no_node_lies_outside_the_sources() {
    let mut judged = 0;
    for seed in 0..300 {
        let circuit = held_from_ground(seed, 30);
        let analysis = run::states(&circuit.text());
        let held = held(&circuit);
        let low = held.iter().flatten().min().copied().unwrap_or(0) as f64 * 1e-3;
        let high = held.iter().flatten().max().copied().unwrap_or(0) as f64 * 1e-3;
        let case = nominal(&analysis).unwrap_or_else(|problem| panic!("{problem}\n{}", circuit.text()));
        for node in case.solutions.iter().flat_map(|solution| &solution.nodes) {
            if let Quantity::Known(volts) = node.voltage {
                judged += 1;
                let slack = 1e-12 * low.abs().max(high);
                assert!(
                    low - slack <= volts && volts <= high + slack,
                    "{} = {volts} lies outside {low} … {high}\n{}",
                    analysis.circuit.node_name(node.node),
                    circuit.text()
                );
            }
        }
    }
    assert!(judged > 1000, "only {judged} potentials were judged");
}

/// Sources of voltage to ground, resistors, and diodes of which some have no resistance of their own.
fn held_from_ground(seed: u64, percent_bare: usize) -> Circuit {
    let mut dice = Seed(seed ^ 0x0417);
    let nodes = dice.between(6, 24);
    let mut circuit = Circuit::with_nodes(format!("held from ground, {seed}"), nodes);
    for _ in 0..nodes + nodes / 2 {
        let (from, to) = two(&mut dice, nodes);
        circuit.r(from, to, *dice.pick(&[100, 270, 1000, 3300]));
    }
    for node in 1..=dice.between(1, 4) {
        circuit.v(node, 0, Dec::new(*dice.pick(&[5, 12, 20, -5, 33, 7]), -1));
    }
    for _ in 0..dice.between(4, 16) {
        let (from, to) = two(&mut dice, nodes);
        let drop = Dec::new(*dice.pick(&[3, 6, 7, 0, 13]), -1);
        let breakdown = dice.chance(30).then(|| Dec::new(*dice.pick(&[20, 27, 51]), -1));
        let series = if dice.chance(percent_bare) { Dec::ZERO } else { Dec::from(10) };
        circuit.diode(from, to, Diode { drop, breakdown, series });
    }
    for _ in 0..dice.below(3) {
        let (from, to) = two(&mut dice, nodes);
        let ideal = circuit.diodes().any(|(_, d)| d.drop.is_zero());
        if !ideal && !circuit.elements.iter().any(|e| matches!(e.kind, Kind::L)) {
            circuit.add(from, to, Kind::L);
        }
    }
    circuit.compact();
    circuit
}

fn two(dice: &mut Seed, nodes: usize) -> (usize, usize) {
    let from = dice.below(nodes + 1);
    let step = dice.between(1, nodes);
    (from, (from + step) % (nodes + 1))
}

/// Millivolts of the nodes that sources hold, ground included.
fn held(circuit: &Circuit) -> Vec<Option<i64>> {
    let mut held = vec![None; circuit.nodes.len()];
    held[0] = Some(0);
    for element in &circuit.elements {
        if let Kind::V(volts) = &element.kind {
            held[element.from] = Some(millivolts(*volts));
        }
    }
    held
}

fn millivolts(volts: Dec) -> i64 {
    let milli = volts.scaled(3);
    milli.digits * 10i64.pow(milli.exponent.unsigned_abs())
}

/// Potentials that all diodes without resistance admit exist exactly where no way along them between held nodes sums
/// to less than the difference (systems of differences and shortest paths: R. Bellman, Quart. Appl. Math. 16 (1958)
/// 87–90); without current sources that is all a solution needs (G. J. Minty, "Monotone networks", Proc. R. Soc.
/// Lond. A 257 (1960) 194–212; pages from memory).
#[test]
fn there_is_no_solution_exactly_where_a_way_of_levels_is_too_short() {
    let (mut none, mut some) = (0, 0);
    for seed in 0..400 {
        let circuit = held_from_ground(seed, 60);
        let analysis = run::states(&circuit.text());
        let case = nominal(&analysis).unwrap_or_else(|problem| panic!("{problem}\n{}", circuit.text()));
        let contradicts = too_short(&circuit);
        if contradicts {
            none += 1;
        } else {
            some += 1;
        }
        assert_eq!(
            case.verdict == Verdict::None,
            contradicts,
            "the verdict is {:?}\n{}",
            case.verdict,
            circuit.text()
        );
    }
    assert!(none >= 40 && some >= 40, "{none} contradictions, {some} solvable");
}

/// Whether some way of diodes and shorts between held nodes has levels that sum to less than the difference: shortest
/// distances in millivolts from each held node.
fn too_short(circuit: &Circuit) -> bool {
    let mut arcs = Vec::new();
    for element in &circuit.elements {
        match &element.kind {
            Kind::D(diode) if diode.series.is_zero() => {
                arcs.push((element.from, element.to, millivolts(diode.drop)));
                if let Some(breakdown) = diode.breakdown {
                    arcs.push((element.to, element.from, millivolts(breakdown)));
                }
            }
            Kind::L => {
                arcs.push((element.from, element.to, 0));
                arcs.push((element.to, element.from, 0));
            }
            _ => {}
        }
    }
    let held = held(circuit);
    (0..held.len()).any(|start| {
        let Some(from) = held[start] else { return false };
        let mut distance = vec![None; held.len()];
        distance[start] = Some(0);
        for _ in 0..held.len() {
            for &(a, b, level) in &arcs {
                if let Some(so_far) = distance[a]
                    && distance[b].is_none_or(|known| so_far + level < known)
                {
                    distance[b] = Some(so_far + level);
                }
            }
        }
        held.iter().zip(&distance).any(|(to, far)| match (to, far) {
            (Some(to), Some(far)) => *far < from - to,
            _ => false,
        })
    })
}

/// The dual: without voltage sources zero volts suit every diode, and a solution exists exactly where the currents
/// find their way, which a greatest flow tells (L. R. Ford & D. R. Fulkerson, Canad. J. Math. 8 (1956) 399–404).
#[test]
fn there_is_no_solution_exactly_where_sources_push_into_a_dead_end() {
    let (mut none, mut some) = (0, 0);
    for seed in 0..300 {
        let circuit = fed_by_currents(seed);
        let analysis = run::states(&circuit.text());
        let case = nominal(&analysis).unwrap_or_else(|problem| panic!("{problem}\n{}", circuit.text()));
        let finds_a_way = currents_find_a_way(&circuit);
        if finds_a_way {
            some += 1;
        } else {
            none += 1;
        }
        assert_eq!(
            case.verdict != Verdict::None,
            finds_a_way,
            "the verdict is {:?}\n{}",
            case.verdict,
            circuit.text()
        );
    }
    assert!(none >= 40 && some >= 40, "{none} contradictions, {some} solvable");
}

fn fed_by_currents(seed: u64) -> Circuit {
    let mut dice = Seed(seed ^ 0xC0DE);
    let nodes = dice.between(4, 16);
    let mut circuit = Circuit::with_nodes(format!("fed by currents, {seed}"), nodes);
    for _ in 0..nodes / 2 {
        let (from, to) = two(&mut dice, nodes);
        circuit.r(from, to, *dice.pick(&[100, 270, 1000, 3300]));
    }
    for _ in 0..nodes {
        let (from, to) = two(&mut dice, nodes);
        let breakdown = dice.chance(25).then(|| Dec::new(51, -1));
        let series = if dice.chance(40) { Dec::from(10) } else { Dec::ZERO };
        circuit.diode(from, to, Diode { drop: Dec::new(*dice.pick(&[3, 6, 7]), -1), breakdown, series });
    }
    for _ in 0..dice.between(1, 3) {
        let (from, to) = two(&mut dice, nodes);
        circuit.i(from, to, Dec::milli(*dice.pick(&[1, 2, 3])));
    }
    circuit.compact();
    circuit
}

fn currents_find_a_way(circuit: &Circuit) -> bool {
    let nodes = circuit.nodes.len();
    // milliamperes pushed into each node, and the arcs along which any current may flow
    let mut pushed = vec![0i64; nodes];
    let mut open = vec![vec![false; nodes]; nodes];
    for element in &circuit.elements {
        let (from, to) = (element.from, element.to);
        match &element.kind {
            Kind::I(amperes) => {
                let milli = millivolts(*amperes);
                pushed[from] -= milli;
                pushed[to] += milli;
            }
            Kind::D(diode) => {
                open[from][to] = true;
                open[to][from] |= diode.breakdown.is_some();
            }
            _ => {
                open[from][to] = true;
                open[to][from] = true;
            }
        }
    }
    let mut flow = vec![vec![0i64; nodes]; nodes];
    while let Some(start) = (0..nodes).find(|&n| pushed[n] > 0) {
        let Some(way) = way(start, &pushed, &open, &flow) else { return false };
        for pair in way.windows(2) {
            flow[pair[0]][pair[1]] += 1;
            flow[pair[1]][pair[0]] -= 1;
        }
        pushed[start] -= 1;
        pushed[way[way.len() - 1]] += 1;
    }
    true
}

/// A way for one more milliampere from `start` to a node that still wants some.
fn way(start: usize, pushed: &[i64], open: &[Vec<bool>], flow: &[Vec<i64>]) -> Option<Vec<usize>> {
    let mut before = vec![None; pushed.len()];
    let mut queue = std::collections::VecDeque::from([start]);
    while let Some(node) = queue.pop_front() {
        if pushed[node] < 0 {
            let mut way = vec![node];
            while let Some(previous) = before[way[way.len() - 1]] {
                way.push(previous);
            }
            way.reverse();
            return Some(way);
        }
        for next in 0..pushed.len() {
            let passes = open[node][next] || flow[next][node] > 0;
            if passes && next != start && before[next].is_none() {
                before[next] = Some(node);
                queue.push_back(next);
            }
        }
    }
    None
}

/// What a result says, in an order of its own: states, then voltages and currents by name. Parts without a solution
/// have none.
fn signature(circuit: &Circuit, analysis: &Analysis) -> (Verdict, Vec<String>, Vec<Quantity>, Vec<Quantity>) {
    let case = nominal(analysis).unwrap_or_else(|problem| panic!("{problem}\n{}", circuit.text()));
    let (mut states, mut volts, mut amperes) = (Vec::new(), Vec::new(), Vec::new());
    for solution in &case.solutions {
        let named = Named::new(analysis, solution);
        for element in &circuit.elements {
            if let Kind::D(_) = element.kind {
                let diode = named.diode(&element.name);
                states.push(format!("{} {:?}", element.name, diode.as_ref().map(|d| d.state)));
                volts.push(diode.as_ref().map_or(Quantity::Unknown, |d| d.voltage));
                amperes.push(diode.as_ref().map_or(Quantity::Unknown, |d| d.current));
            } else {
                amperes.push(named.branch(&element.name).map_or(Quantity::Unknown, |branch| branch.current));
            }
        }
        for node in &circuit.nodes[1..] {
            volts.push(named.node(node).map_or(Quantity::Unknown, |node| node.voltage));
        }
    }
    (case.verdict, states, volts, amperes)
}

/// Whether quantities are `factor` times others, within what rounding leaves.
fn same(these: &[Quantity], those: &[Quantity], factor: f64) -> bool {
    let size = |q: &Quantity| match q {
        Quantity::Known(value) => value.abs(),
        _ => 0.0,
    };
    let largest = these.iter().map(size).fold(0.0, f64::max).max(1e-9 * factor);
    let near = |a: f64, b: f64| a == b || (a - b).abs() <= 1e-9 * a.abs() + 1e-12 * largest;
    these.len() == those.len()
        && these.iter().zip(those).all(|pair| match pair {
            (Quantity::Known(a), Quantity::Known(b)) => near(*a, b * factor),
            (Quantity::Open(a), Quantity::Open(b)) => {
                near(a.low, b.low * factor) && near(a.high, b.high * factor)
            }
            (Quantity::Unknown, Quantity::Unknown) => true,
            _ => false,
        })
}

fn networks() -> impl Iterator<Item = Circuit> {
    (0..120).map(random::network).chain((0..30).map(|seed| random::connected(seed, 10 + seed as usize)))
}

/// Nothing hangs on the order of lines or on names.
#[test]
fn order_and_names_change_nothing() {
    for circuit in networks() {
        let mut other = circuit.clone();
        Seed(7).shuffle(&mut other.elements);
        let names = |n: usize| format!("w{}", (n * 7919) % 1009);
        (1..other.nodes.len()).for_each(|n| other.nodes[n] = names(n));
        let mut back = circuit.clone();
        back.nodes.clone_from(&other.nodes);
        let this = signature(&circuit, &run::states(&circuit.text()));
        let that = signature(&back, &run::states(&other.text()));
        let agree = this.0 == that.0
            && this.1 == that.1
            && same(&this.2, &that.2, 1.0)
            && same(&this.3, &that.3, 1.0);
        assert!(agree, "{this:?}\nagainst\n{that:?}\n{}\n{}", circuit.text(), other.text());
    }
}

/// The units one measures in change nothing: all resistances 10^k times as large and all currents as much smaller;
/// all voltages and currents 10^k times as large.
#[test]
fn scaling_changes_only_the_scale() {
    for (ohms, volts) in [(3, 0), (-4, 0), (7, 0), (0, 3), (0, -5), (5, 4)] {
        for circuit in networks() {
            let mut other = circuit.clone();
            other.elements.iter_mut().for_each(|element| element.kind = scaled(&element.kind, ohms, volts));
            let this = signature(&circuit, &run::states(&circuit.text()));
            let that = signature(&other, &run::states(&other.text()));
            let agree = this.0 == that.0
                && this.1 == that.1
                && same(&that.2, &this.2, 10f64.powi(volts))
                && same(&that.3, &this.3, 10f64.powi(volts - ohms));
            assert!(agree, "{this:?}\nagainst\n{that:?}\n{}\n{}", circuit.text(), other.text());
        }
    }
}

fn scaled(kind: &Kind, ohms: i32, volts: i32) -> Kind {
    match kind {
        Kind::R(value) => Kind::R(value.scaled(ohms)),
        Kind::V(value) => Kind::V(value.scaled(volts)),
        Kind::I(value) => Kind::I(value.scaled(volts - ohms)),
        Kind::D(diode) => Kind::D(Diode {
            drop: diode.drop.scaled(volts),
            breakdown: diode.breakdown.map(|b| b.scaled(volts)),
            series: diode.series.scaled(ohms),
        }),
        other => other.clone(),
    }
}
