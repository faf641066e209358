//! Puts a solution back into the circuit laws: Kirchhoff's current law at every node, the law of every element,
//! every inequality of every state. Written from the circuit's elements, not from the network that was solved,
//! so that a mistake in either shows.

use super::assemble::{NONE, Setting, main_path};
use super::result::Residual;
use super::switch::{Position, Switches};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::complementarity::{Outcome, Place, Verdict};

/// Largest miss that counts as met, as a share of the largest term at its node or loop.
pub(crate) const MET: f64 = 1e-9;

/// What is beneath this share of the part's largest voltage or current is nothing.
const NOTHING: f64 = 1e-12;

/// How well one solution meets the laws.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Proof {
    /// Largest misses.
    pub residual: Residual,
    /// Elements whose law, or whose node, is missed by more than [`MET`], with the relative miss.
    pub misses: Vec<(ElementId, f64)>,
}

/// A sum that does not add noise of its own: Neumaier, ZAMM 54 (1974).
#[derive(Debug, Clone, Copy, Default)]
struct Sum {
    total: f64,
    lost: f64,
    largest: f64,
}

impl Sum {
    fn add(&mut self, term: f64) {
        let next = self.total + term;
        self.lost += if self.total.abs() >= term.abs() {
            (self.total - next) + term
        } else {
            (term - next) + self.total
        };
        self.total = next;
        self.largest = self.largest.max(term.abs());
    }

    fn value(self) -> f64 {
        self.total + self.lost
    }
}

/// What the proof needs to know of a solution.
pub(crate) struct Claim<'a> {
    /// Potential of each node; not a number where not evaluated.
    pub potentials: &'a [f64],
    /// Current of each branch; not a number where not evaluated.
    pub currents: &'a [f64],
    /// Place of each branch.
    pub places: &'a [Place],
    /// First branch of each element.
    pub branch: &'a [u32],
    /// Currents of the supplies, in their order.
    pub supplies: &'a [f64],
}

/// Largest voltage and current around each node: the scale beneath which a miss is rounding.
struct Scales {
    part_of_node: Vec<usize>,
    /// Whether a part claims to be solved; what belongs to no part does.
    claimed: Vec<bool>,
    /// Branches of parts that do not.
    unclaimed: Vec<bool>,
    voltage: Vec<f64>,
    current: Vec<f64>,
}

/// Checks everything that `claim` says about evaluated elements.
pub(crate) fn prove(setting: &Setting<'_>, outcome: &Outcome, claim: &Claim<'_>) -> Proof {
    let scales = Scales::of(setting, outcome, claim);
    let mut prover = Prover {
        setting,
        claim,
        switches: Switches::of(setting),
        scales,
        nodes: vec![Sum::default(); setting.circuit.nodes.len().max(1)],
        proof: Proof { residual: Residual::default(), misses: Vec::new() },
    };
    for (id, element) in setting.circuit.elements() {
        prover.element(id, &element.behaviour);
    }
    prover.supplies();
    prover.kirchhoff();
    prover.proof
}

impl Scales {
    fn of(setting: &Setting<'_>, outcome: &Outcome, claim: &Claim<'_>) -> Self {
        let count = setting.circuit.nodes.len().max(1);
        let whole = outcome.parts.len();
        let mut part_of_node = vec![whole; count];
        let mut voltage = vec![0.0_f64; whole + 1];
        let mut current = vec![0.0_f64; whole + 1];
        let all = |list: &[f64]| list.iter().filter(|v| v.is_finite()).fold(0.0_f64, |m, v| m.max(v.abs()));
        voltage[whole] = all(claim.potentials);
        current[whole] = all(claim.currents);
        for (n, part) in outcome.parts.iter().enumerate() {
            for &node in &part.nodes {
                part_of_node[node as usize] = n;
            }
            let branches = part.branches.iter().filter_map(|&b| claim.currents.get(b as usize));
            current[n] = branches.filter(|i| i.is_finite()).fold(0.0, |m, i| m.max(i.abs()));
        }
        let mut claimed: Vec<bool> = outcome.parts.iter().map(|p| claims_solution(p.verdict)).collect();
        claimed.push(true);
        let mut unclaimed = vec![false; claim.currents.len()];
        for part in outcome.parts.iter().filter(|p| !claims_solution(p.verdict)) {
            for &branch in &part.branches {
                unclaimed[branch as usize] = true;
            }
        }
        let mut scales = Scales { part_of_node, claimed, unclaimed, voltage, current };
        for (id, _) in setting.circuit.elements() {
            let ends = (setting.circuit.node(id, 0), setting.circuit.node(id, 1));
            let part = scales.part(ends.0, ends.1);
            // a boundary's potential is a term in the laws of the part behind it
            for node in [ends.0, ends.1] {
                let volts = claim.potentials.get(node.index()).copied().filter(|v| v.is_finite());
                scales.voltage[part] = scales.voltage[part].max(volts.unwrap_or(0.0).abs());
            }
        }
        scales
    }

    /// The part of an element: that of either end which is no boundary.
    fn part(&self, a: NodeId, b: NodeId) -> usize {
        let whole = self.voltage.len() - 1;
        let of = |n: NodeId| self.part_of_node.get(n.index()).copied().unwrap_or(whole);
        if of(a) == whole { of(b) } else { of(a) }
    }
}

struct Prover<'a> {
    setting: &'a Setting<'a>,
    claim: &'a Claim<'a>,
    switches: Switches,
    scales: Scales,
    nodes: Vec<Sum>,
    proof: Proof,
}

/// What kind of law is missed.
#[derive(Clone, Copy)]
enum Kind {
    Voltage,
    Current,
}

impl Prover<'_> {
    fn potential(&self, node: NodeId) -> f64 {
        if node == NodeId::GROUND {
            return 0.0;
        }
        self.claim.potentials.get(node.index()).copied().unwrap_or(f64::NAN)
    }

    fn number(&self, id: ElementId) -> Option<usize> {
        self.claim.branch.get(id.index()).filter(|&&b| b != NONE).map(|&b| b as usize)
    }

    fn current(&self, id: ElementId) -> f64 {
        self.number(id).and_then(|b| self.claim.currents.get(b)).copied().unwrap_or(f64::NAN)
    }

    /// Judges `miss`, which should be 0, against its largest term and the scale of its surroundings.
    fn judge(&mut self, id: ElementId, kind: Kind, miss: f64, terms: &[f64], ends: (NodeId, NodeId)) {
        let part = self.scales.part(ends.0, ends.1);
        let unclaimed = self.number(id).is_some_and(|b| self.scales.unclaimed.get(b) == Some(&true));
        if !self.scales.claimed[part] || unclaimed {
            return;
        }
        let (floor, worst) = match kind {
            Kind::Voltage => (self.scales.voltage[part], &mut self.proof.residual.voltage),
            Kind::Current => (self.scales.current[part], &mut self.proof.residual.current),
        };
        let largest = terms.iter().fold(0.0_f64, |m, t| m.max(t.abs())).max(floor * (NOTHING / MET));
        *worst = worst.max(miss.abs());
        let relative = if miss == 0.0 { 0.0 } else { miss.abs() / largest };
        // a miss that is not a number is a miss
        if relative.is_nan() || relative > MET {
            self.proof.misses.push((id, relative));
        }
        self.proof.residual.relative = self.proof.residual.relative.max(relative);
    }

    /// Counts the current into Kirchhoff's law at both ends.
    fn flow(&mut self, from: NodeId, to: NodeId, current: f64) {
        // what a part without a solution carries is not known where it meets others either
        let current = if self.scales.claimed[self.scales.part(from, to)] { current } else { f64::NAN };
        if from != to {
            self.nodes[from.index()].add(-current);
            self.nodes[to.index()].add(current);
        }
    }

    fn element(&mut self, id: ElementId, behaviour: &Behaviour) {
        let circuit = self.setting.circuit;
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        match behaviour {
            Behaviour::Capacitor { .. } | Behaviour::Coupling { .. } => {}
            Behaviour::Unknown { .. } => self.spoil(id),
            Behaviour::Resistor(ohms) => {
                let ohms = self.setting.resistance(id, *ohms);
                self.voltage_law(id, a, b, |p, v| v - ohms * p.current(id), |p| ohms * p.current(id));
            }
            Behaviour::Inductor { .. } => self.voltage_law(id, a, b, |_, v| v, |_| 0.0),
            Behaviour::VoltageSource(_) => {
                let volts = self.setting.source(id).value;
                self.voltage_law(id, a, b, |_, v| v - volts, |_| volts);
            }
            Behaviour::CurrentSource(_) => {
                let amperes = self.setting.source(id).value;
                self.current_law(id, a, b, amperes, amperes);
            }
            Behaviour::Diode { .. } => self.diode(id, a, b),
            Behaviour::VoltageByVoltage { gain } => {
                let wanted = gain.number * self.control_voltage(id);
                let scale = gain.number * self.control_scale(id);
                self.voltage_law(id, a, b, |_, v| v - wanted, |_| scale);
            }
            Behaviour::CurrentByVoltage { gain } => {
                let wanted = gain.number * self.control_voltage(id);
                self.current_law(id, a, b, wanted, gain.number * self.control_scale(id));
            }
            Behaviour::VoltageByCurrent { gain, control } => {
                let wanted = control.map_or(f64::NAN, |c| gain.number * self.current(c));
                self.voltage_law(id, a, b, |_, v| v - wanted, |_| wanted);
            }
            Behaviour::CurrentByCurrent { gain, control } => {
                let wanted = control.map_or(f64::NAN, |c| gain.number * self.current(c));
                self.current_law(id, a, b, wanted, wanted);
            }
            Behaviour::VoltageSwitch { .. }
            | Behaviour::CurrentSwitch { .. }
            | Behaviour::Transistor { .. } => self.held(id),
        }
    }

    fn control_voltage(&self, id: ElementId) -> f64 {
        let circuit = self.setting.circuit;
        self.potential(circuit.node(id, 2)) - self.potential(circuit.node(id, 3))
    }

    /// The control's terms: a difference of large potentials is no better than they are, and what is nothing among
    /// the voltages around the control is nothing before its gain too.
    fn control_scale(&self, id: ElementId) -> f64 {
        let circuit = self.setting.circuit;
        let (plus, minus) = (circuit.node(id, 2), circuit.node(id, 3));
        let around = self.scales.voltage[self.scales.part(plus, minus)];
        self.potential(plus).abs().max(self.potential(minus).abs()).max(around * (NOTHING / MET))
    }

    fn held(&mut self, id: ElementId) {
        let (a, b) = main_path(self.setting.circuit, id);
        match self.switches.position(self.setting, id) {
            Position::Open => {}
            Position::Unknown => self.spoil(id),
            Position::Joined => self.voltage_law(id, a, b, |_, v| v, |_| 0.0),
            Position::Through(ohms) => {
                self.voltage_law(id, a, b, |p, v| v - ohms * p.current(id), |p| ohms * p.current(id));
            }
        }
    }

    /// What an unknown element carries is not known, so its nodes' sums are not either.
    fn spoil(&mut self, id: ElementId) {
        for pin in self.setting.circuit.pins(id) {
            self.nodes[pin.node.index()].add(f64::NAN);
        }
    }

    fn voltage_law(
        &mut self,
        id: ElementId,
        a: NodeId,
        b: NodeId,
        miss: impl Fn(&Self, f64) -> f64,
        term: impl Fn(&Self) -> f64,
    ) {
        let current = self.current(id);
        self.flow(a, b, current);
        if self.potential(a).is_nan() || self.potential(b).is_nan() {
            return;
        }
        let volts = self.potential(a) - self.potential(b);
        let (miss, term) = (miss(self, volts), term(self));
        if !miss.is_nan() {
            self.judge(id, Kind::Voltage, miss, &[volts, term], (a, b));
        }
    }

    fn current_law(&mut self, id: ElementId, a: NodeId, b: NodeId, wanted: f64, scale: f64) {
        let current = self.current(id);
        self.flow(a, b, current);
        let miss = current - wanted;
        if !miss.is_nan() {
            self.judge(id, Kind::Current, miss, &[current, wanted, scale], (a, b));
        }
    }

    /// The junction law, and the inequality of the state that was claimed.
    fn diode(&mut self, id: ElementId, a: NodeId, b: NodeId) {
        let current = self.current(id);
        self.flow(a, b, current);
        let volts = self.potential(a) - self.potential(b);
        let Some(diode) = self.setting.diode(id) else { return };
        if current.is_nan() || volts.is_nan() {
            return;
        }
        let inner = volts - diode.series * current;
        let forward = diode.level(self.setting.condition.temperature).value;
        let reverse = diode.reverse.map_or(f64::INFINITY, |l| l.value);
        let place = self.number(id).and_then(|n| self.claim.places.get(n)).copied();
        // sign of the current, and the place of the inner voltage that goes with it
        let against = match place {
            Some(Place::Conducting) => (-current).max(0.0),
            Some(Place::Breakdown) => current.max(0.0),
            Some(Place::Open) => 0.0,
            _ => current.abs(),
        };
        self.judge(id, Kind::Current, against, &[], (a, b));
        let beyond = (inner - forward).max(-reverse - inner).max(0.0);
        let terms = [volts, diode.series * current, forward];
        self.judge(id, Kind::Voltage, beyond, &terms, (a, b));
        if self.is_something(current, a, b) {
            let level = if current > 0.0 { forward } else { -reverse };
            self.judge(id, Kind::Voltage, inner - level, &terms, (a, b));
        }
    }

    /// Whether a current is more than rounding in its surroundings.
    fn is_something(&self, current: f64, a: NodeId, b: NodeId) -> bool {
        current.abs() > NOTHING * self.scales.current[self.scales.part(a, b)]
    }

    fn supplies(&mut self) {
        let setting = self.setting;
        let supplies = setting.plan.supplies.iter().zip(&setting.condition.supplies);
        for ((supply, level), &current) in supplies.zip(self.claim.supplies) {
            self.flow(supply.node, NodeId::GROUND, current);
            let miss = self.potential(supply.node) - level.value;
            // no element to name: its node's sum carries the blame
            if miss.abs() > MET * level.value.abs() {
                self.nodes[supply.node.index()].add(miss);
            }
        }
    }

    /// Kirchhoff's current law; a node is named by the first element that touches it.
    fn kirchhoff(&mut self) {
        let whole = self.scales.voltage.len() - 1;
        let mut missed = vec![0.0_f64; self.nodes.len()];
        for (n, sum) in self.nodes.iter().enumerate() {
            let miss = sum.value();
            if miss.is_nan() {
                continue;
            }
            let part = self.scales.part_of_node.get(n).copied().unwrap_or(whole);
            // ground's sum is that of all others, so it can hold only where they all do
            let implied = n == NodeId::GROUND.index() && self.scales.claimed.contains(&false);
            if implied || !self.scales.claimed[part] {
                continue;
            }
            let largest = sum.largest.max(self.scales.current[part] * (NOTHING / MET));
            let relative = if miss == 0.0 { 0.0 } else { miss.abs() / largest };
            let residual = &mut self.proof.residual;
            residual.current = residual.current.max(miss.abs());
            residual.relative = residual.relative.max(relative);
            missed[n] = relative;
        }
        for (id, _) in self.setting.circuit.elements() {
            for pin in self.setting.circuit.pins(id) {
                let relative = std::mem::take(&mut missed[pin.node.index()]);
                if relative > MET {
                    self.proof.misses.push((id, relative));
                }
            }
        }
    }
}

/// Whether a part claims to be solved, so that its numbers must be finite and are checked.
pub(crate) fn claims_solution(verdict: Verdict) -> bool {
    !matches!(verdict, Verdict::Partial | Verdict::None | Verdict::Unverified)
}
