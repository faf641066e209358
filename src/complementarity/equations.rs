//! The linear equations of a part with controlled laws: unknown potentials and currents, the laws as rows. Currents
//! of junctions are left open: they are what `ports` solves for. Nothing is solved here.

use super::bundle::{self, Bundle};
use super::double_double::Dd;
use super::network::{Control, Law, Network};
use super::parts::Piece;
use super::rails::{Rails, fixed};
use rustc_hash::{FxHashMap, FxHashSet};

/// Where a branch's current is found.
#[derive(Debug, Clone)]
pub(super) enum Spot {
    /// A number.
    Known(f64),
    /// An unknown of the equations.
    Unknown(usize),
    /// The current of a bundle of junctions, by its place among them.
    Port(usize),
    /// By Ohm's law from potentials.
    Ohm(f64),
    /// The sum of what these branches carry away (+1) or bring (−1): a boundary's source.
    Sum(Vec<(u32, f64)>),
    /// Not in this part.
    Elsewhere,
}

/// A number in a row and a column; those of one place add up.
pub(super) type Entry = (usize, usize, f64);

/// Equations `matrix · x + ports · i = rhs`.
pub(super) struct Equations<'a> {
    rails: &'a Rails,
    pub(super) nodes: Vec<u32>,
    pub(super) branches: Vec<u32>,
    pub(super) bundles: Vec<Bundle>,
    /// Nodes whose potential nothing fixes.
    pub(super) floating: Vec<u32>,
    pub(super) matrix: Vec<Entry>,
    pub(super) ports: Vec<Entry>,
    pub(super) rhs: Vec<Dd>,
    /// Unknown of each node; boundaries have their potential from the rails.
    place: FxHashMap<u32, usize>,
    spots: FxHashMap<u32, Spot>,
    ends: FxHashMap<u32, (u32, u32)>,
}

/// A linear form over unknowns and ports.
#[derive(Default, Clone)]
struct Form {
    x: Vec<(usize, f64)>,
    port: Vec<(usize, f64)>,
    /// Potentials of boundaries, each with its factor: rounded together with those of unknowns or not at all, so that what
    /// stands at such a potential is found there.
    held: Vec<(Dd, f64)>,
    constant: Dd,
}

impl Form {
    fn add(&mut self, other: &Form, factor: f64) {
        self.x.extend(other.x.iter().map(|&(n, c)| (n, c * factor)));
        self.port.extend(other.port.iter().map(|&(n, c)| (n, c * factor)));
        self.held.extend(other.held.iter().map(|&(v, c)| (v, c * factor)));
        self.constant += other.constant.times(factor);
    }

    /// What does not depend on unknowns.
    fn known(&self) -> Dd {
        self.held.iter().fold(self.constant, |sum, &(v, c)| sum + v.times(c))
    }
}

impl<'a> Equations<'a> {
    pub(super) fn new(network: &Network, rails: &'a Rails, piece: &Piece) -> Self {
        let nodes: Vec<u32> = piece.groups.iter().flat_map(|&g| rails.nodes_of(g)).copied().collect();
        let place = nodes.iter().enumerate().map(|(k, &n)| (n, k)).collect();
        let mut equations = Equations {
            branches: piece.branches.clone(),
            bundles: Vec::new(),
            floating: Vec::new(),
            matrix: Vec::new(),
            ports: Vec::new(),
            rhs: Vec::new(),
            place,
            rails,
            spots: Default::default(),
            ends: Default::default(),
            nodes,
        };
        equations.take_stock(network, rails);
        let pins = equations.islands(network);
        equations.fill(network, rails, &pins);
        equations
    }

    /// Says of each branch where its current is found.
    fn take_stock(&mut self, network: &Network, rails: &Rails) {
        let mut unknown = self.nodes.len();
        // a source that pushes current in may be counted with another part
        let own: FxHashSet<u32> = self.branches.iter().copied().collect();
        let foreign = rails.pushing.iter().copied().filter(|n| !own.contains(n));
        self.branches.extend(foreign.filter(|&n| {
            let b = &network.branches[n as usize];
            self.place.contains_key(&b.from) || self.place.contains_key(&b.to)
        }));
        self.bundles = bundle::bundles(network, &self.branches);
        for (k, bundle) in self.bundles.iter().enumerate() {
            for (member, &n) in bundle.members.iter().enumerate() {
                // the first carries the current of all of them until it is shared out
                self.spots.insert(n, if member == 0 { Spot::Port(k) } else { Spot::Known(0.0) });
            }
        }
        for &n in &self.branches {
            let b = &network.branches[n as usize];
            self.ends.insert(n, (b.from, b.to));
            let spot = match b.law {
                Law::Junction(_) => continue,
                Law::Resistance(r) => Spot::Ohm(r),
                Law::Current(level) => Spot::Known(level.value),
                Law::Unknown => Spot::Known(f64::NAN),
                _ => {
                    unknown += 1;
                    Spot::Unknown(unknown - 1)
                }
            };
            self.spots.insert(n, spot);
        }
        for &n in &self.branches.clone() {
            if let Some(Control::Current(c)) = control(network.branches[n as usize].law)
                && !self.spots.contains_key(&c)
            {
                let spot = boundary_sum(network, rails, c);
                self.spots.insert(c, spot);
            }
        }
        self.rhs = vec![Dd::ZERO; unknown];
    }

    /// One node of each island that no branch ties to a boundary; its island floats.
    fn islands(&mut self, network: &Network) -> Vec<usize> {
        let count = self.nodes.len();
        let mut sets = super::forest::Sets::new(count + 1);
        let spot = |n: u32| self.place.get(&n).map_or(0, |&k| k as u32 + 1);
        for &n in &self.branches {
            let b = &network.branches[n as usize];
            if !matches!(b.law, Law::Current(_)) {
                sets.union(spot(b.from), spot(b.to));
            }
        }
        let mut pins = Vec::new();
        let mut floating = Vec::new();
        for k in 0..count as u32 {
            let root = sets.find(k + 1);
            if root == k + 1 {
                pins.push(k as usize);
            }
            if root != 0 {
                floating.push(self.nodes[k as usize]);
            }
        }
        self.floating = floating;
        pins
    }

    fn fill(&mut self, network: &Network, rails: &Rails, pins: &[usize]) {
        for &n in &self.branches.clone() {
            let b = &network.branches[n as usize];
            if fixed(b.law).is_some() && rails.forest.group[b.from as usize] == 0 {
                continue;
            }
            let i = self.form_of_current(network, n);
            for (node, sign) in [(b.from, 1.0), (b.to, -1.0)] {
                if let Some(&row) = self.place.get(&node)
                    && b.from != b.to
                {
                    self.add_row(row, &i, sign);
                }
            }
            if let Some(&Spot::Unknown(row)) = self.spots.get(&n) {
                let law = self.law(network, n);
                self.add_row(row, &law, 1.0);
            }
        }
        let pinned: FxHashSet<usize> = pins.iter().copied().collect();
        self.matrix.retain(|(row, ..)| !pinned.contains(row));
        self.ports.retain(|(row, ..)| !pinned.contains(row));
        for &k in pins {
            self.rhs[k] = Dd::ZERO;
            self.matrix.push((k, k, 1.0));
        }
    }

    fn add_row(&mut self, row: usize, form: &Form, factor: f64) {
        for &(n, c) in &form.x {
            self.matrix.push((row, n, c * factor));
        }
        for &(n, c) in &form.port {
            self.ports.push((row, n, c * factor));
        }
        self.rhs[row] += -form.known().times(factor);
    }

    fn form_of_node(&self, node: u32) -> Form {
        match self.place.get(&node) {
            Some(&k) => Form { x: vec![(k, 1.0)], ..Form::default() },
            None if self.rails.forest.group[node as usize] == 0 => {
                Form { held: vec![(self.rails.forest.offset[node as usize], 1.0)], ..Form::default() }
            }
            None => Form { constant: f64::NAN.into(), ..Form::default() },
        }
    }

    fn form_of_voltage(&self, from: u32, to: u32) -> Form {
        let mut form = self.form_of_node(from);
        form.add(&self.form_of_node(to), -1.0);
        form
    }

    fn form_of_current(&self, network: &Network, n: u32) -> Form {
        let b = &network.branches[n as usize];
        match self.spots.get(&n) {
            Some(Spot::Known(i)) => Form { constant: (*i).into(), ..Form::default() },
            Some(Spot::Unknown(k)) => Form { x: vec![(*k, 1.0)], ..Form::default() },
            Some(Spot::Port(k)) => Form { port: vec![(*k, 1.0)], ..Form::default() },
            Some(Spot::Ohm(r)) => {
                let mut form = Form::default();
                form.add(&self.form_of_voltage(b.from, b.to), 1.0 / r);
                form
            }
            Some(Spot::Sum(terms)) => {
                let mut form = Form::default();
                for &(other, sign) in terms {
                    form.add(&self.form_of_current(network, other), sign);
                }
                form
            }
            Some(Spot::Elsewhere) | None => Form { constant: f64::NAN.into(), ..Form::default() },
        }
    }

    /// Zero where the law of a branch with an unknown current is met.
    fn law(&self, network: &Network, n: u32) -> Form {
        let b = &network.branches[n as usize];
        match b.law {
            Law::CurrentControlled(gain, by) => {
                let mut form = self.form_of_current(network, n);
                form.add(&self.form_of_control(network, by), -gain);
                form
            }
            Law::VoltageControlled(gain, by) => {
                let mut form = self.form_of_voltage(b.from, b.to);
                form.add(&self.form_of_control(network, by), -gain);
                form
            }
            law => {
                let mut form = self.form_of_voltage(b.from, b.to);
                form.constant += (-fixed(law).map_or(f64::NAN, |l| l.value)).into();
                form
            }
        }
    }

    fn form_of_control(&self, network: &Network, by: Control) -> Form {
        match by {
            Control::Voltage(p, q) => self.form_of_voltage(p, q),
            Control::Current(n) => self.form_of_current(network, n),
        }
    }

    /// Whether every law could be written down.
    pub(super) fn complete(&self) -> bool {
        self.rhs.iter().all(|v| v.round().is_finite()) && self.matrix.iter().all(|(.., v)| v.is_finite())
    }

    /// Potential of a node at `x` (unknowns, then junction currents).
    pub(super) fn potential(&self, x: &[Dd], node: u32) -> f64 {
        self.value(&self.form_of_node(node), x).round()
    }

    pub(super) fn potential_change(&self, change: &[f64], node: u32) -> f64 {
        self.change(&self.form_of_node(node), change)
    }

    /// Potential of `from` minus that of `to`; not a number where one of them belongs to another part.
    pub(super) fn voltage(&self, x: &[Dd], from: u32, to: u32) -> f64 {
        self.value(&self.form_of_voltage(from, to), x).round()
    }

    pub(super) fn voltage_change(&self, change: &[f64], from: u32, to: u32) -> f64 {
        self.change(&self.form_of_voltage(from, to), change)
    }

    pub(super) fn current(&self, network: &Network, x: &[Dd], n: u32) -> f64 {
        // a difference of potentials is taken before it is divided, so that nothing of it is lost
        if let (Some(Spot::Ohm(r)), Some(&(from, to))) = (self.spots.get(&n), self.ends.get(&n)) {
            return self.value(&self.form_of_voltage(from, to), x).over(*r).round();
        }
        self.value(&self.form_of_current(network, n), x).round()
    }

    pub(super) fn current_change(&self, network: &Network, change: &[f64], n: u32) -> f64 {
        self.change(&self.form_of_current(network, n), change)
    }

    /// Largest current that a potential at an end of a resistance would drive through it alone: what such currents
    /// are differences of.
    pub(super) fn largest_term(&self, x: &[Dd]) -> f64 {
        let term = |n: &u32| match (self.spots.get(n), self.ends.get(n)) {
            (Some(Spot::Ohm(r)), Some(&(from, to))) => {
                self.potential(x, from).abs().max(self.potential(x, to).abs()) / r.abs()
            }
            _ => 0.0,
        };
        self.branches.iter().map(term).filter(|t| t.is_finite()).fold(0.0, f64::max)
    }

    fn value(&self, form: &Form, x: &[Dd]) -> Dd {
        let ports = form.port.iter().map(|&(k, c)| (self.rhs.len() + k, c));
        let mut sum = form.known();
        for (k, c) in form.x.iter().copied().chain(ports) {
            sum += x[k].times(c);
        }
        sum
    }

    fn change(&self, form: &Form, by: &[f64]) -> f64 {
        let ports = form.port.iter().map(|&(k, c)| (self.rhs.len() + k, c));
        form.x.iter().copied().chain(ports).map(|(k, c)| c * by[k]).sum()
    }

    /// Nodes between which a junction stands, as a row over the unknowns and a constant.
    pub(super) fn voltage_row(&self, n: u32) -> (Vec<(usize, f64)>, Dd) {
        let (from, to) = self.ends.get(&n).copied().unwrap_or((0, 0));
        let form = self.form_of_voltage(from, to);
        let known = form.known();
        (form.x, known)
    }
}

fn control(law: Law) -> Option<Control> {
    match law {
        Law::VoltageControlled(_, by) | Law::CurrentControlled(_, by) => Some(by),
        _ => None,
    }
}

/// The current of a tie between boundaries: what every other branch takes from the nodes beyond it.
fn boundary_sum(network: &Network, rails: &Rails, branch: u32) -> Spot {
    let b = &network.branches[branch as usize];
    let Some(beyond) = rails.beyond(branch) else { return Spot::Elsewhere };
    let direction = if beyond[b.from as usize] { 1.0 } else { -1.0 };
    let mut terms = Vec::new();
    for (n, b) in network.branches.iter().enumerate().filter(|(_, b)| fixed(b.law).is_none()) {
        let sign = f64::from(u8::from(beyond[b.to as usize])) - f64::from(u8::from(beyond[b.from as usize]));
        if sign != 0.0 {
            terms.push((n as u32, direction * sign));
        }
    }
    Spot::Sum(terms)
}
