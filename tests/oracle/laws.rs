//! Kirchhoff's laws and the laws of all elements but the diodes' states, as affine forms of what they leave free.

use super::affine::{Equation, Form, Step, equate};
use super::enumerate::Assumed;
use super::{Rat, exact};
use crate::circuits::{Circuit, Kind};

/// A circuit whose diodes may still be in any state.
pub struct Laws {
    /// Potential of each node (ground included), then voltage across each element, then current through each.
    pub quantities: Vec<Form>,
    /// One for each diode.
    pub junctions: Vec<Junction>,
    /// Number of parameters the forms are written in (some of them no longer used).
    pub parameters: usize,
    /// The laws contradict each other whatever the diodes do.
    pub impossible: bool,
}

/// A diode's state variables.
#[derive(Clone)]
pub struct Junction {
    /// Position of the element.
    pub element: usize,
    /// Anode and cathode.
    pub ends: (usize, usize),
    /// Voltage without the series resistance.
    pub inner: Form,
    /// Current.
    pub current: Form,
    /// Drop.
    pub forward: Rat,
    /// Breakdown voltage.
    pub reverse: Option<Rat>,
    /// No drop and no series resistance.
    pub ideal: bool,
}

/// All that the laws say, the diodes left free, or each held by what `states` says is zero.
pub fn laws(circuit: &Circuit, states: &[Assumed]) -> Laws {
    let unknowns = Unknowns::of(circuit);
    let mut laws = Laws {
        quantities: unknowns.quantities(circuit),
        junctions: Vec::new(),
        parameters: unknowns.count,
        impossible: false,
    };
    laws.junctions = unknowns.junctions(circuit);
    let mut equations = unknowns.current_laws(circuit);
    equations.extend(unknowns.source_laws(circuit));
    // taken from the end: what fixes most with the least arithmetic comes first
    for (junction, state) in laws.junctions.iter().zip(states) {
        match junction.equation(*state) {
            Some(equation) => equations.push(equation),
            None => laws.impossible = true,
        }
    }
    while let Some(equation) = equations.pop() {
        match equate(&equation) {
            Equation::Holds => {}
            Equation::Fails => laws.impossible = true,
            Equation::Fixes(step) => {
                equations.iter_mut().for_each(|form| form.substitute(&step));
                laws.apply(&step);
            }
        }
    }
    laws.compact();
    laws
}

impl Laws {
    /// Keeps only the parameters that something still depends on.
    fn compact(&mut self) {
        let live: Vec<usize> = (0..self.parameters)
            .filter(|&p| self.quantities.iter().any(|form| !form.coefficients[p].is_zero()))
            .collect();
        self.quantities.iter_mut().for_each(|form| *form = form.only(&live));
        for junction in &mut self.junctions {
            junction.inner = junction.inner.only(&live);
            junction.current = junction.current.only(&live);
        }
        self.parameters = live.len();
    }

    fn apply(&mut self, step: &Step) {
        self.quantities.iter_mut().for_each(|form| form.substitute(step));
        for junction in &mut self.junctions {
            junction.inner.substitute(step);
            junction.current.substitute(step);
        }
    }
}

/// Where each unknown stands among the parameters.
struct Unknowns {
    count: usize,
    /// Parameter of each element's current, where it is not given by its voltage or written.
    currents: Vec<Option<usize>>,
}

impl Unknowns {
    fn of(circuit: &Circuit) -> Self {
        let mut count = circuit.nodes.len() - 1;
        let mut fresh = || {
            count += 1;
            count - 1
        };
        let currents = (circuit.elements.iter())
            .map(|element| match &element.kind {
                Kind::R(ohms) if !ohms.is_zero() => None,
                Kind::I(_) | Kind::C | Kind::G { .. } | Kind::F { .. } => None,
                _ => Some(fresh()),
            })
            .collect();
        Unknowns { count, currents }
    }

    fn zero(&self) -> Form {
        Form { coefficients: vec![Rat::zero(); self.count], constant: Rat::zero() }
    }

    fn potential(&self, node: usize) -> Form {
        if node == 0 { self.zero() } else { Form::parameter(node - 1, self.count) }
    }

    fn between(&self, from: usize, to: usize) -> Form {
        let mut form = self.potential(from);
        form.add(&self.potential(to), &-&Rat::one());
        form
    }

    fn current(&self, circuit: &Circuit, at: usize) -> Form {
        let mut form = self.zero();
        let element = &circuit.elements[at];
        match &element.kind {
            Kind::R(ohms) if !ohms.is_zero() => {
                form.add(&self.between(element.from, element.to), &exact(*ohms).recip());
            }
            Kind::I(amperes) => form.constant = exact(*amperes),
            Kind::G { gain, control } => form.add(&self.between(control.0, control.1), &exact(*gain)),
            Kind::F { gain, control } => form.add(&self.current_of(circuit, control), &exact(*gain)),
            _ => {
                if let Some(parameter) = self.currents[at] {
                    form = Form::parameter(parameter, self.count);
                }
            }
        }
        form
    }

    fn current_of(&self, circuit: &Circuit, name: &str) -> Form {
        let at = circuit.elements.iter().position(|e| e.name == name);
        at.map_or_else(|| self.zero(), |at| self.current(circuit, at))
    }

    fn quantities(&self, circuit: &Circuit) -> Vec<Form> {
        let potentials = (0..circuit.nodes.len()).map(|node| self.potential(node));
        let voltages = circuit.elements.iter().map(|e| self.between(e.from, e.to));
        let currents = (0..circuit.elements.len()).map(|at| self.current(circuit, at));
        potentials.chain(voltages).chain(currents).collect()
    }

    fn junctions(&self, circuit: &Circuit) -> Vec<Junction> {
        let junction = |(at, diode): (usize, &crate::circuits::Diode)| {
            let element = &circuit.elements[at];
            let current = self.current(circuit, at);
            let mut inner = self.between(element.from, element.to);
            inner.add(&current, &-&exact(diode.series));
            Junction {
                element: at,
                ends: (element.from, element.to),
                inner,
                current,
                forward: exact(diode.drop),
                reverse: diode.breakdown.map(exact),
                ideal: diode.drop.is_zero() && diode.series.is_zero(),
            }
        };
        circuit.diodes().map(junction).collect()
    }

    /// What leaves each node but ground sums to nothing.
    fn current_laws(&self, circuit: &Circuit) -> Vec<Form> {
        let mut sums = vec![self.zero(); circuit.nodes.len()];
        for (at, element) in circuit.elements.iter().enumerate() {
            let current = self.current(circuit, at);
            sums[element.from].add(&current, &Rat::one());
            sums[element.to].add(&current, &-&Rat::one());
        }
        sums.split_off(1)
    }

    fn source_laws(&self, circuit: &Circuit) -> Vec<Form> {
        let mut laws = Vec::new();
        for element in &circuit.elements {
            let mut law = self.between(element.from, element.to);
            match &element.kind {
                Kind::V(volts) => law.constant -= exact(*volts),
                Kind::E { gain, control } => law.add(&self.between(control.0, control.1), &-&exact(*gain)),
                Kind::H { gain, control } => law.add(&self.current_of(circuit, control), &-&exact(*gain)),
                Kind::L => {}
                Kind::R(ohms) if ohms.is_zero() => {}
                _ => continue,
            }
            laws.push(law);
        }
        laws
    }
}
