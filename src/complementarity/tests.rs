//! Whole solutions: networks small enough to work out by hand, and random ones judged by substitution. Convexity
//! makes substitution enough: a point that meets every law of a monotone network is a solution.

use super::*;

pub(super) fn level(value: f64) -> Level {
    Level { value, exact: true }
}

pub(super) fn branch(from: u32, to: u32, law: Law) -> Branch {
    Branch { from, to, law }
}

pub(super) fn diode(from: u32, to: u32, forward: f64) -> Branch {
    branch(from, to, Law::Junction(Junction { forward: level(forward), reverse: None, series: 0.0 }))
}

pub(super) fn zener(from: u32, to: u32, forward: f64, reverse: f64) -> Branch {
    let reverse = Some(level(reverse));
    branch(from, to, Law::Junction(Junction { forward: level(forward), reverse, series: 0.0 }))
}

pub(super) fn network(branches: &[Branch]) -> Network {
    let nodes = branches.iter().map(|b| b.from.max(b.to) + 1).max().unwrap_or(1);
    Network { nodes, branches: branches.to_vec() }
}

fn volts(v: f64) -> Law {
    Law::Voltage(level(v))
}

fn ohms(r: f64) -> Law {
    Law::Resistance(r)
}

fn close(q: Quantity, expected: f64) -> bool {
    q.known().is_some_and(|v| (v - expected).abs() <= 1e-12 * expected.abs().max(1e-3))
}

#[test]
fn source_resistor_diode() {
    let outcome = network(&[branch(1, 0, volts(5.0)), branch(1, 2, ohms(1e3)), diode(2, 0, 0.7)]).solve();
    assert_eq!(outcome.verdict, Verdict::Unique);
    let s = &outcome.solutions[0];
    assert!(close(s.currents[2], 4.3e-3) && close(s.currents[0], -4.3e-3), "{s:?}");
    assert_eq!(s.places[2], Place::Conducting);
}

#[test]
fn parallel_equal_drops_share() {
    let outcome =
        network(&[branch(1, 0, volts(15.0)), branch(1, 2, ohms(500.0)), diode(2, 0, 0.7), diode(2, 0, 0.7)])
            .solve();
    assert_eq!(outcome.verdict, Verdict::Shared);
    let range = outcome.solutions[0].currents[2].interval().unwrap();
    assert!(range.low == 0.0 && (range.high - 0.0286).abs() < 1e-15, "{range:?}");
}

#[test]
fn three_drops_beside_their_exact_sum_share() {
    let outcome = network(&[
        branch(1, 0, volts(15.0)),
        branch(1, 2, ohms(500.0)),
        diode(2, 3, 0.7),
        diode(3, 4, 0.7),
        diode(4, 0, 0.7),
        diode(2, 0, 2.1),
    ])
    .solve();
    assert_eq!(outcome.verdict, Verdict::Shared);
}

#[test]
fn chain_of_blocking_diodes_floats() {
    // a gate with a clamp chain that nothing drives: the chain's middle floats between its neighbours' limits
    let outcome = network(&[
        branch(1, 0, volts(5.0)),
        branch(1, 2, ohms(5e3)),
        branch(3, 0, volts(0.2)),
        diode(2, 3, 0.7),
        diode(2, 4, 0.7),
        diode(4, 5, 0.7),
        diode(5, 0, 0.7),
    ])
    .solve();
    assert_eq!(outcome.verdict, Verdict::Floating);
    let s = &outcome.solutions[0];
    assert!(close(s.potentials[2], 0.9));
    let range = s.potentials[4].interval().unwrap();
    assert!((range.low - 0.2).abs() < 1e-12 && (range.high - 1.4).abs() < 1e-12, "{range:?}");
    assert_eq!(s.places[4], Place::Blocking);
}

#[test]
fn diode_across_a_source_has_no_limit() {
    let outcome = network(&[branch(1, 0, volts(5.0)), diode(1, 0, 0.7)]).solve();
    assert_eq!(outcome.verdict, Verdict::None);
    match &outcome.parts.iter().find(|p| p.verdict == Verdict::None).unwrap().reasons[..] {
        [Reason::Loop { branches, gap }] => {
            assert_eq!(branches, &[1, 0]);
            assert!((gap - 4.3).abs() < 1e-12);
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn current_against_a_diode_has_no_way_out() {
    let outcome = network(&[branch(1, 0, Law::Current(level(1e-3))), diode(1, 0, 0.7)]).solve();
    assert_eq!(outcome.verdict, Verdict::None);
}

#[test]
fn sources_that_contradict_each_other() {
    let outcome =
        network(&[branch(1, 0, volts(5.0)), branch(1, 0, volts(3.0)), branch(2, 0, volts(1.0))]).solve();
    assert_eq!(outcome.verdict, Verdict::None);
    assert!(close(outcome.solutions[0].potentials[2], 1.0));
    assert_eq!(outcome.solutions[0].potentials[1], Quantity::Unknown);
}

#[test]
fn breakdown_holds_its_voltage() {
    let outcome =
        network(&[branch(1, 0, volts(12.0)), branch(1, 2, ohms(1e3)), zener(0, 2, 0.7, 5.1)]).solve();
    let s = &outcome.solutions[0];
    assert!(close(s.potentials[2], 5.1) && close(s.currents[2], -6.9e-3), "{s:?}");
    assert_eq!(s.places[2], Place::Breakdown);
}

#[test]
fn antiparallel_ideal_diodes_do_not_circulate() {
    let outcome =
        network(&[branch(1, 0, volts(1.0)), branch(1, 2, ohms(1e3)), diode(2, 0, 0.0), diode(0, 2, 0.0)])
            .solve();
    let s = &outcome.solutions[0];
    assert_eq!(outcome.verdict, Verdict::Unique, "{s:?}");
    assert!(close(s.currents[2], 1e-3) && close(s.currents[3], 0.0));
}

#[test]
fn an_island_of_its_own_has_known_currents_and_open_potentials() {
    let outcome = network(&[branch(1, 2, volts(5.0)), branch(1, 3, ohms(1e3)), diode(3, 2, 0.7)]).solve();
    assert_eq!(outcome.verdict, Verdict::Floating);
    let s = &outcome.solutions[0];
    assert!(close(s.currents[2], 4.3e-3) && close(s.voltages[2], 0.7));
    assert_eq!(s.potentials[1].interval(), Some(Interval { low: f64::NEG_INFINITY, high: f64::INFINITY }));
}

/// Small deterministic generator (SplitMix64).
pub(super) struct Dice(pub(super) u64);

impl Dice {
    pub(super) fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }
    pub(super) fn below(&mut self, n: u64) -> u64 {
        self.next() % n
    }
}

pub(super) fn random(dice: &mut Dice, spread: bool) -> Network {
    let nodes = 3 + dice.below(7) as u32;
    let mut branches = Vec::new();
    for _ in 0..2 + dice.below(14) {
        let (a, b) = (dice.below(nodes as u64) as u32, dice.below(nodes as u64) as u32);
        if a == b {
            continue;
        }
        let decade = if spread { 10f64.powi(dice.below(15) as i32 - 6) } else { 1e3 };
        let law = match dice.below(10) {
            0..=2 => ohms((1 + dice.below(9)) as f64 * decade),
            3 => volts(dice.below(13) as f64),
            4 => Law::Current(level(dice.below(4) as f64 * 1e-3)),
            5 if dice.below(4) == 0 => Law::Short,
            n => Law::Junction(Junction {
                forward: level([0.0, 0.3, 0.7, 0.7, 1.4][dice.below(5) as usize]),
                reverse: (n == 9).then(|| level([2.1, 5.1][dice.below(2) as usize])),
                series: if dice.below(4) == 0 { 10.0 } else { 0.0 },
            }),
        };
        branches.push(branch(a, b, law));
    }
    let mut network = network(&branches);
    network.nodes = nodes;
    network
}

pub(super) fn show(network: &Network) -> String {
    let line = |(n, b): (usize, &Branch)| {
        let law = match b.law {
            Law::Junction(j) => {
                format!("junction {} {:?} {}", j.forward.value, j.reverse.map(|r| r.value), j.series)
            }
            Law::Voltage(l) => format!("volts {}", l.value),
            Law::Current(l) => format!("amperes {}", l.value),
            law => format!("{law:?}"),
        };
        format!("\n{n}: {} {} {law}", b.from, b.to)
    };
    network.branches.iter().enumerate().map(line).collect()
}

/// Largest miss of any law by the sample, as a share of the terms involved; parts not evaluated are skipped.
pub(super) fn miss(network: &Network, solution: &Solution) -> f64 {
    let (u, i) = &solution.sample;
    let mut worst = 0.0f64;
    let largest = u.iter().filter(|u| u.is_finite()).fold(1e-3, |m: f64, u| m.max(u.abs()));
    let mut net = vec![(0.0, 0.0f64); network.nodes as usize];
    for (n, b) in network.branches.iter().enumerate() {
        for (node, sign) in [(b.from, -1.0), (b.to, 1.0)] {
            net[node as usize].0 += sign * i[n];
            net[node as usize].1 = net[node as usize].1.max(i[n].abs());
        }
        let (up, uq) = (u[b.from as usize], u[b.to as usize]);
        let v = up - uq;
        // what cancels is known to a share of the largest potential
        let size = up.abs().max(uq.abs()).max(0.01 * largest);
        let off = match b.law {
            Law::Resistance(r) => (v - r * i[n]).abs() / size.max((r * i[n]).abs()),
            // one of those that contradict each other
            Law::Voltage(_) | Law::Short if i[n].is_nan() => 0.0,
            Law::Voltage(l) => (v - l.value).abs() / size.max(l.value.abs()),
            Law::Short => v.abs() / size,
            Law::Junction(j) => {
                let inner = v - j.series * i[n];
                let size = size + j.forward.value;
                let reverse = j.reverse.map_or(f64::INFINITY, |r| r.value);
                let pinned = if i[n] > 0.0 { (inner - j.forward.value).abs() } else { 0.0 };
                let broken = if i[n] < 0.0 { (inner + reverse).abs() } else { 0.0 };
                pinned.max(broken).max(inner - j.forward.value).max(-reverse - inner) / size
            }
            _ => 0.0,
        };
        if off.is_finite() || b.law == Law::Short {
            worst = worst.max(off);
        }
    }
    let most = i.iter().filter(|i| i.is_finite()).map(|i| i.abs()).fold(0.0, f64::max);
    for ((sum, gross), u) in net.iter().zip(u).skip(1) {
        if u.is_finite() && sum.is_finite() && *gross > 0.0 {
            worst = worst.max(sum.abs() / gross.max(1e-15 * most));
        }
    }
    worst
}

#[test]
fn random_networks_satisfy_every_law() {
    let mut dice = Dice(7);
    let mut counts = std::collections::BTreeMap::new();
    for trial in 0..20_000 {
        let network = random(&mut dice, trial % 2 == 1);
        let outcome = network.solve();
        *counts.entry(format!("{:?}", outcome.verdict)).or_insert(0) += 1;
        assert_ne!(outcome.verdict, Verdict::Unverified, "trial {trial}: {}", show(&network));
        for solution in &outcome.solutions {
            let unknown = solution.sample.1.iter().any(|i| i.is_nan());
            assert!(!unknown || outcome.verdict == Verdict::None, "trial {trial}: {}", show(&network));
            let miss = miss(&network, solution);
            assert!(
                miss < 1e-9,
                "trial {trial}: {miss} {} {:?}\n{:?}",
                show(&network),
                outcome.verdict,
                solution.sample
            );
        }
    }
    for verdict in ["Unique", "Shared", "Floating", "SharedFloating", "None"] {
        assert!(counts.get(verdict).is_some_and(|&n| n > 20), "{verdict}: {counts:?}");
    }
}

#[test]
fn pushed_current_breaks_a_junction_down() {
    let outcome = network(&[
        branch(2, 5, ohms(4e3)),
        branch(
            2,
            0,
            Law::Junction(Junction { forward: level(0.7), reverse: Some(level(2.1)), series: 10.0 }),
        ),
        diode(0, 1, 0.7),
        zener(5, 1, 0.0, 5.1),
        branch(3, 1, Law::Current(level(3e-3))),
    ])
    .solve();
    let s = &outcome.solutions[0];
    assert!(close(s.currents[3], -3e-3), "{s:?}");
}
