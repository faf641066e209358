//! The proof accepts a right solution and rejects one that breaks any law.

use super::Laid;
use crate::complementarity::{Interval, Outcome, Place, Quantity, Solution, Verdict};
use crate::config::Options;
use crate::config::SecondOpinion;
use crate::operating::assemble::{Assembly, Setting, Slots, assemble};
use crate::operating::case::{Ask, case};
use crate::operating::evaluate::Solved;
use crate::operating::proof::{Claim, MET, Proof, prove};
use crate::operating::targets::Targets;

/// One element of every kind; worked out by hand below.
const LINES: &str = "V1 in 0 10
R1 in a 1k
D1 a 0 DX
D2 0 a DX
R2 in z 1k
D3 0 z DZ
I1 0 b 2m
R3 b 0 1k
L1 b c 1m
R4 c 0 1k
E1 e 0 b 0 2
R5 e 0 1k
G1 0 g b 0 1m
R6 g 0 1k
H1 h 0 V1 100
R7 h 0 1k
F1 0 f V1 0.1
R8 f 0 1k
.model DX D
.model DZ D(BV=5.1)";

const VOLTS: [(&str, f64); 10] = [
    ("in", 10.0),
    ("a", 0.7),
    ("z", 5.1),
    ("b", 1.0),
    ("c", 1.0),
    ("e", 2.0),
    ("g", 1.0),
    ("h", -1.42),
    ("f", -1.42),
    ("0", 0.0),
];

const AMPERES: [(&str, f64); 18] = [
    ("V1", -14.2e-3),
    ("R1", 9.3e-3),
    ("D1", 9.3e-3),
    ("D2", 0.0),
    ("R2", 4.9e-3),
    ("D3", -4.9e-3),
    ("I1", 2e-3),
    ("R3", 1e-3),
    ("L1", 1e-3),
    ("R4", 1e-3),
    ("E1", -2e-3),
    ("R5", 2e-3),
    ("G1", 1e-3),
    ("R6", 1e-3),
    ("H1", 1.42e-3),
    ("R7", -1.42e-3),
    ("F1", -1.42e-3),
    ("R8", -1.42e-3),
];

struct Bench {
    laid: Laid,
    slots: Slots,
    assembly: Assembly,
    potentials: Vec<f64>,
    currents: Vec<f64>,
    places: Vec<Place>,
}

impl Bench {
    fn new() -> Self {
        let laid = Laid::out(LINES, &Options::default());
        let slots = laid.slots();
        let setting = Setting {
            circuit: &laid.circuit,
            plan: &laid.plan,
            slots: &slots,
            diodes: &laid.diodes,
            condition: &laid.plan.conditions[0],
        };
        let assembly = assemble(&setting);
        let mut bench = Bench {
            potentials: vec![0.0; laid.circuit.nodes.len()],
            currents: vec![0.0; assembly.owner.len()],
            places: vec![Place::Blocking; assembly.owner.len()],
            laid,
            slots,
            assembly,
        };
        for (name, volts) in VOLTS {
            *bench.volts(name) = volts;
        }
        for (name, amperes) in AMPERES {
            *bench.amperes(name) = amperes;
        }
        *bench.place("D1") = Place::Conducting;
        *bench.place("D3") = Place::Breakdown;
        bench
    }

    fn volts(&mut self, name: &str) -> &mut f64 {
        let node = (0..self.laid.circuit.nodes.len() as u32)
            .find(|&n| self.laid.circuit.node_name(crate::circuit::NodeId(n)) == name)
            .unwrap();
        &mut self.potentials[node as usize]
    }

    fn branch(&self, name: &str) -> usize {
        self.assembly.branch[self.laid.element(name).index()] as usize
    }

    fn amperes(&mut self, name: &str) -> &mut f64 {
        let branch = self.branch(name);
        &mut self.currents[branch]
    }

    fn place(&mut self, name: &str) -> &mut Place {
        let branch = self.branch(name);
        &mut self.places[branch]
    }

    fn setting(&self) -> Setting<'_> {
        Setting {
            circuit: &self.laid.circuit,
            plan: &self.laid.plan,
            slots: &self.slots,
            diodes: &self.laid.diodes,
            condition: &self.laid.plan.conditions[0],
        }
    }

    fn outcome(&self) -> Outcome {
        let known = |list: &[f64]| list.iter().map(|&v| Quantity::Known(v)).collect::<Vec<_>>();
        let voltages: Vec<f64> = self
            .assembly
            .network
            .branches
            .iter()
            .map(|b| self.potentials[b.from as usize] - self.potentials[b.to as usize])
            .collect();
        let solution = Solution {
            potentials: known(&self.potentials),
            voltages: known(&voltages),
            currents: known(&self.currents),
            places: self.places.clone(),
            sample: (self.potentials.clone(), self.currents.clone()),
        };
        Outcome {
            verdict: Verdict::Unique,
            parts: Vec::new(),
            solutions: vec![solution],
            truncated: false,
            solves: 1,
        }
    }

    fn prove(&self) -> Proof {
        let claim = Claim {
            potentials: &self.potentials,
            currents: &self.currents,
            places: &self.places,
            branch: &self.assembly.branch,
            supplies: &[],
        };
        prove(&self.setting(), &self.outcome(), &claim)
    }
}

#[test]
fn a_right_solution_stands() {
    let proof = Bench::new().prove();
    assert_eq!(proof.misses, []);
    assert!(proof.residual.relative < MET, "{:?}", proof.residual);
}

#[test]
fn every_current_counts() {
    for (name, amperes) in AMPERES {
        let mut bench = Bench::new();
        *bench.amperes(name) = amperes + 1e-7;
        assert!(!bench.prove().misses.is_empty(), "a wrong current of {name} went unseen");
    }
}

#[test]
fn every_potential_counts() {
    for (name, volts) in VOLTS.into_iter().filter(|v| v.0 != "0") {
        let mut bench = Bench::new();
        *bench.volts(name) = volts + 1e-6;
        assert!(!bench.prove().misses.is_empty(), "a wrong potential of {name} went unseen");
    }
}

/// Changes that keep Kirchhoff's current law, so that only the element's own law can object.
#[test]
fn every_law_counts_by_itself() {
    // a loop current through two elements in parallel between the same nodes
    let loops: [&[(&str, f64)]; 8] = [
        &[("I1", 1e-6), ("R3", 1e-6)],
        &[("E1", 1e-6), ("R5", -1e-6)],
        &[("G1", 1e-6), ("R6", 1e-6)],
        &[("H1", 1e-6), ("R7", -1e-6)],
        &[("F1", 1e-6), ("R8", 1e-6)],
        &[("D1", 1e-6), ("D2", 1e-6)],
        &[("V1", -1e-6), ("R2", 1e-6), ("D3", -1e-6)],
        &[("L1", 1e-6), ("R4", 1e-6), ("R3", -1e-6)],
    ];
    for changes in loops {
        let mut bench = Bench::new();
        for (name, change) in changes {
            *bench.amperes(name) += change;
        }
        assert!(!bench.prove().misses.is_empty(), "{changes:?} went unseen");
    }
}

#[test]
fn every_inequality_counts() {
    for (name, place) in [
        ("D1", Place::Blocking),
        ("D1", Place::Breakdown),
        ("D3", Place::Blocking),
        ("D3", Place::Conducting),
    ] {
        let mut bench = Bench::new();
        *bench.place(name) = place;
        assert!(!bench.prove().misses.is_empty(), "{name} as {place:?} went unseen");
    }
    // a diode that blocks above its drop, everything else right: no current in R1, D1 at 10 V
    let mut bench = Bench::new();
    *bench.volts("a") = 10.0;
    *bench.amperes("R1") = 0.0;
    *bench.amperes("D1") = 0.0;
    *bench.place("D1") = Place::Blocking;
    *bench.amperes("V1") = -4.9e-3;
    *bench.volts("h") = -0.49;
    *bench.amperes("R7") = -0.49e-3;
    *bench.amperes("H1") = 0.49e-3;
    *bench.volts("f") = -0.49;
    *bench.amperes("R8") = -0.49e-3;
    *bench.amperes("F1") = -0.49e-3;
    let misses = bench.prove().misses;
    assert_eq!(misses.len(), 1, "{misses:?}");
    assert_eq!(misses[0].0, bench.laid.element("D1"));
}

#[test]
fn a_result_that_does_not_check_is_withheld() {
    let mut bench = Bench::new();
    *bench.amperes("R5") += 1e-6;
    let solved = Solved { outcome: bench.outcome(), assembly: bench.assembly.clone() };
    let case = case(&bench.setting(), &plain(&Targets::default()), &solved);
    assert_eq!(case.verdict, Verdict::Unverified);
    assert!(case.solutions.is_empty());
    assert!(case.residual.relative > MET);
    assert!(case.causes[0].elements.contains(&bench.laid.element("R5")));
}

#[test]
fn a_right_result_is_told_by_name() {
    let mut bench = Bench::new();
    let mut outcome = bench.outcome();
    let open = bench.branch("D2");
    outcome.solutions[0].voltages[open] = Quantity::Open(Interval { low: -0.7, high: 0.0 });
    let solved = Solved { outcome, assembly: bench.assembly.clone() };
    let case = case(&bench.setting(), &plain(&Targets::default()), &solved);
    assert_eq!(case.verdict, Verdict::Unique);
    let solution = &case.solutions[0];
    assert_eq!(solution.diodes.len(), 3);
    assert_eq!(solution.diodes[0].power, Some(0.7 * 9.3e-3));
    assert_eq!(solution.diodes[1].power, None);
    assert_eq!(solution.nodes.len(), 9);
    assert_eq!(solution.branches.len(), 15);
    assert_eq!(case.sources.len(), 2);
    let _ = bench.place("D1");
}

fn plain(targets: &Targets) -> Ask<'_> {
    Ask { why: None, targets, opinion: SecondOpinion::Usual }
}
