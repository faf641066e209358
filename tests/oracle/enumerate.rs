//! Tries every assignment of states, depth first, each diode fixing one of its two variables.

use super::Rat;
use super::affine::{Equation, Form, Step, equate};
use super::answer::{Answer, Point, Range};
use super::cone::{self, Shape};
use super::laws::{Junction, Laws, laws};
use crate::circuits::{Circuit, Kind};
use std::collections::HashSet;

/// The solution set of a circuit.
pub fn solve(circuit: &Circuit) -> Answer {
    let laws = laws(circuit, &[]);
    let mut answer =
        Answer { nodes: circuit.nodes.len(), elements: circuit.elements.len(), ..Answer::default() };
    if laws.impossible {
        return answer;
    }
    let mut search = Search {
        laws: &laws,
        idle: idle(circuit),
        leave_out: true,
        seen: HashSet::new(),
        answer: &mut answer,
    };
    search.assign(0, laws.junctions.clone(), &mut Vec::new(), &mut Vec::new());
    answer
}

/// The solution set in which the diodes, in the order of the elements, are in these states; no solution where they
/// cannot be. In a passive network this is the whole set if each diode that can carry current in some solution is
/// said to (its voltage is then at its level in all of them), so that it proves an answer for networks too large to
/// enumerate.
pub fn with_states(circuit: &Circuit, states: &[Assumed]) -> Answer {
    let laws = laws(circuit, states);
    let mut answer =
        Answer { nodes: circuit.nodes.len(), elements: circuit.elements.len(), ..Answer::default() };
    if !laws.impossible && !refuted(&laws.junctions, states) {
        let mut search = Search {
            laws: &laws,
            idle: Vec::new(),
            leave_out: false,
            seen: HashSet::new(),
            answer: &mut answer,
        };
        search.leaf(&laws.junctions, states, &[]);
    }
    answer
}

/// A state that a diode is taken to be in.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Assumed {
    /// At its drop, current ≥ 0.
    Conducting,
    /// No current.
    Blocking,
    /// At its breakdown voltage, current ≤ 0.
    Breakdown,
}

struct Search<'a> {
    laws: &'a Laws,
    /// Sources of 0 V and shorts: position and ends.
    idle: Vec<(usize, usize, usize)>,
    /// Leave out what merely circulates.
    leave_out: bool,
    seen: HashSet<Point>,
    answer: &'a mut Answer,
}

impl Search<'_> {
    fn assign(
        &mut self,
        at: usize,
        junctions: Vec<Junction>,
        assumed: &mut Vec<Assumed>,
        steps: &mut Vec<Step>,
    ) {
        let Some(junction) = junctions.get(at) else {
            return self.leaf(&junctions, assumed, steps);
        };
        for state in [Assumed::Conducting, Assumed::Blocking, Assumed::Breakdown] {
            let Some(equation) = junction.equation(state) else { continue };
            assumed.push(state);
            let depth = steps.len();
            let mut next = junctions.clone();
            let possible = match equate(&equation) {
                Equation::Fails => false,
                Equation::Holds => true,
                Equation::Fixes(step) => {
                    next.iter_mut().for_each(|junction| junction.substitute(&step));
                    steps.push(step);
                    true
                }
            };
            if possible && !refuted(&next, assumed) && !closes_a_loop(ideal_arcs(&next, assumed)) {
                self.assign(at + 1, next, assumed, steps);
            }
            steps.truncate(depth);
            assumed.pop();
        }
    }

    /// All states assumed: what is left of the parameters, and within which bounds.
    fn leaf(&mut self, junctions: &[Junction], assumed: &[Assumed], steps: &[Step]) {
        let diodes: Vec<Form> = junctions
            .iter()
            .zip(assumed)
            .flat_map(|(junction, state)| conditions(junction, *state))
            .collect();
        let mut quantities = self.laws.quantities.clone();
        for step in steps {
            quantities.iter_mut().for_each(|form| form.substitute(step));
        }
        let free: Vec<usize> = (0..self.laws.parameters)
            .filter(|&p| quantities.iter().any(|form| !form.coefficients[p].is_zero()))
            .collect();
        let quantities: Vec<Form> = quantities.iter().map(|form| form.only(&free)).collect();
        for directions in self.directions(junctions, assumed) {
            let mut conditions: Vec<Form> = diodes.iter().map(|form| form.only(&free)).collect();
            conditions.extend(directions.iter().map(|&(at, sign)| {
                let current = &quantities[self.answer.nodes + self.answer.elements + at];
                if sign > 0 { current.clone() } else { current.negated() }
            }));
            // those that depend on nothing have been looked at, or are looked at here
            if conditions.iter().any(|form| form.sign() < 0) {
                continue;
            }
            conditions.retain(|form| form.first().is_some());
            if let Some(shape) = cone::shape(&conditions, free.len()) {
                self.record(&quantities, &shape);
            }
        }
    }

    /// Which ways the currents of sources of 0 V and of shorts may go so that nothing circulates: every choice of
    /// directions that closes no loop of arcs without voltage. One whose ends are joined carries nothing.
    fn directions(&self, junctions: &[Junction], assumed: &[Assumed]) -> Vec<Vec<(usize, i8)>> {
        if !self.leave_out {
            return vec![Vec::new()];
        }
        let ideal = ideal_arcs(junctions, assumed);
        let (joined, two_way): (Vec<_>, Vec<_>) = self.idle.iter().partition(|(_, from, to)| from == to);
        let nothing: Vec<(usize, i8)> = joined.iter().flat_map(|(at, _, _)| [(*at, 1), (*at, -1)]).collect();
        let choice = |number: usize| {
            let mut arcs = ideal.clone();
            let mut signs = nothing.clone();
            for (bit, (at, from, to)) in two_way.iter().enumerate() {
                let forward = number >> bit & 1 == 0;
                arcs.push(if forward { (*from, *to) } else { (*to, *from) });
                signs.push((*at, if forward { 1 } else { -1 }));
            }
            (!closes_a_loop(arcs)).then_some(signs)
        };
        (0..1usize << two_way.len()).filter_map(choice).collect()
    }

    fn record(&mut self, quantities: &[Form], shape: &Shape) {
        let ranges: Vec<Range> = quantities.iter().map(|form| range(form, shape)).collect();
        let answer = &mut *self.answer;
        if answer.ranges.is_empty() {
            answer.ranges = ranges;
        } else {
            answer.ranges.iter_mut().zip(&ranges).for_each(|(all, one)| all.widen(one));
        }
        if shape.corners.len() + shape.directions.len() + shape.lines.len() > 1 {
            answer.continuum = true;
        }
        for corner in &shape.corners {
            let point: Point = quantities.iter().map(|form| value(form, corner)).collect();
            if self.seen.insert(point.clone()) {
                self.answer.points.push(point);
            }
        }
    }
}

fn idle(circuit: &Circuit) -> Vec<(usize, usize, usize)> {
    let idle = |kind: &Kind| match kind {
        Kind::V(value) | Kind::R(value) => value.is_zero(),
        Kind::L => true,
        _ => false,
    };
    let elements = circuit.elements.iter().enumerate();
    elements.filter(|(_, e)| idle(&e.kind)).map(|(at, e)| (at, e.from, e.to)).collect()
}

impl Junction {
    /// What is zero in a state; nothing where the diode has no such state.
    pub fn equation(&self, state: Assumed) -> Option<Form> {
        match state {
            Assumed::Conducting => Some(self.inner.plus(&-&self.forward)),
            Assumed::Blocking => Some(self.current.clone()),
            Assumed::Breakdown => self.reverse.as_ref().map(|reverse| self.inner.plus(reverse)),
        }
    }

    fn substitute(&mut self, step: &Step) {
        self.inner.substitute(step);
        self.current.substitute(step);
    }
}

/// What must be ≥ 0 for an assumption to hold.
fn conditions(junction: &Junction, assumed: Assumed) -> Vec<Form> {
    match assumed {
        Assumed::Conducting => vec![junction.current.clone()],
        Assumed::Breakdown => vec![junction.current.negated()],
        Assumed::Blocking => {
            let mut both = vec![junction.inner.negated().plus(&junction.forward)];
            both.extend(junction.reverse.as_ref().map(|reverse| junction.inner.plus(reverse)));
            both
        }
    }
}

/// Whether an assumption already fails whatever the rest does.
fn refuted(junctions: &[Junction], assumed: &[Assumed]) -> bool {
    let fails = |(junction, state): (&Junction, &Assumed)| match state {
        Assumed::Conducting => junction.current.sign() < 0,
        Assumed::Breakdown => junction.current.sign() > 0,
        Assumed::Blocking => {
            junction.inner.first().is_none()
                && (junction.inner.constant > junction.forward
                    || junction.reverse.as_ref().is_some_and(|reverse| junction.inner.constant < -reverse))
        }
    };
    junctions.iter().zip(assumed).any(fails)
}

/// Arcs of the diodes without drop and series resistance that conduct.
fn ideal_arcs(junctions: &[Junction], assumed: &[Assumed]) -> Vec<(usize, usize)> {
    let diodes = junctions.iter().zip(assumed);
    diodes.filter(|(j, state)| j.ideal && **state == Assumed::Conducting).map(|(j, _)| j.ends).collect()
}

fn closes_a_loop(mut arcs: Vec<(usize, usize)>) -> bool {
    // take away arcs that lead nowhere until none does; a loop stays
    loop {
        let before = arcs.len();
        let leads_on: Vec<bool> = arcs.iter().map(|arc| arcs.iter().any(|next| next.0 == arc.1)).collect();
        let mut leads_on = leads_on.into_iter();
        arcs.retain(|_| leads_on.next() == Some(true));
        if arcs.len() == before {
            return before > 0;
        }
    }
}

fn slope(form: &Form, direction: &[Rat]) -> Rat {
    let terms = form.coefficients.iter().zip(direction);
    terms.filter(|(c, d)| !c.is_zero() && !d.is_zero()).fold(Rat::zero(), |sum, (c, d)| sum + c * d)
}

fn value(form: &Form, point: &[Rat]) -> Rat {
    slope(form, point) + &form.constant
}

fn range(form: &Form, shape: &Shape) -> Range {
    let values: Vec<Rat> = shape.corners.iter().map(|corner| value(form, corner)).collect();
    let mut range = Range { low: values.iter().min().cloned(), high: values.iter().max().cloned() };
    if form.first().is_none() {
        return range;
    }
    for direction in &shape.directions {
        let slope = slope(form, direction);
        if slope.is_negative() {
            range.low = None;
        } else if slope.is_positive() {
            range.high = None;
        }
    }
    if shape.lines.iter().any(|line| !slope(form, line).is_zero()) {
        range = Range { low: None, high: None };
    }
    range
}
