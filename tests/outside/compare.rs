//! One answer of kneewise against the exact solution set of the same network.

use crate::circuits::{Circuit, Kind};
use crate::oracle::{
    Answer, Division, Part, Range, Rat, StateWord, Verdict, acceptable_verdicts, divide, float, solve,
};
use crate::run::{Named, nominal};
use kneewise::analysis::Analysis;
use kneewise::circuit::State;
use kneewise::complementarity::{self, Quantity};
use kneewise::operating::{Case, Solution};
use std::fmt::Write;

/// How near is near: a share of the value itself, and of the network's largest voltage or current.
#[derive(Debug, Clone, Copy)]
pub struct Tolerance {
    pub relative: f64,
    pub of_largest: f64,
}

/// For networks of ordinary values.
pub const CLOSE: Tolerance = Tolerance { relative: 1e-9, of_largest: 1e-12 };

/// For networks that span many decades.
pub const WIDE: Tolerance = Tolerance { relative: 1e-6, of_largest: 1e-12 };

/// What differs, one line each; empty where everything agrees.
pub fn differences(
    circuit: &Circuit,
    answer: &Answer,
    analysis: &Analysis,
    tolerance: Tolerance,
) -> Vec<String> {
    let case = match nominal(analysis) {
        Ok(case) => case,
        Err(problem) => return vec![problem],
    };
    let mut found = Differences { circuit, scale: Scale::of(circuit, answer), tolerance, list: Vec::new() };
    let wanted = acceptable_verdicts(circuit, answer);
    let got = verdict(case.verdict);
    if got.is_none_or(|got| !wanted.contains(&got)) {
        found.list.push(format!("verdict: got {:?}, expected {wanted:?}", case.verdict));
    }
    match wanted.first() {
        Some(Verdict::None) => found.sound_parts(analysis, case),
        Some(Verdict::Several) => found.several(analysis, case, answer),
        _ => found.single(analysis, case, answer),
    }
    found.list
}

fn verdict(verdict: complementarity::Verdict) -> Option<Verdict> {
    match verdict {
        complementarity::Verdict::Unique => Some(Verdict::Unique),
        complementarity::Verdict::Shared => Some(Verdict::Shared),
        complementarity::Verdict::Floating => Some(Verdict::Floating),
        complementarity::Verdict::SharedFloating => Some(Verdict::SharedFloating),
        complementarity::Verdict::Several => Some(Verdict::Several),
        complementarity::Verdict::None => Some(Verdict::None),
        complementarity::Verdict::Partial | complementarity::Verdict::Unverified => None,
    }
}

/// Largest voltage and current of the network.
#[derive(Debug, Clone, Copy)]
pub struct Scale {
    pub volts: f64,
    pub amperes: f64,
}

impl Scale {
    pub fn of(circuit: &Circuit, answer: &Answer) -> Self {
        let (mut volts, mut amperes, mut ohms) = (0f64, 0f64, 0f64);
        for element in &circuit.elements {
            match &element.kind {
                Kind::V(value) => volts = volts.max(value.float().abs()),
                Kind::I(value) => amperes = amperes.max(value.float().abs()),
                Kind::R(value) => ohms = ohms.max(value.float().abs()),
                Kind::D(diode) => {
                    volts = volts.max(diode.drop.float()).max(diode.breakdown.map_or(0.0, |b| b.float()));
                }
                _ => {}
            }
        }
        for point in &answer.points {
            let (potentials, voltages, currents) = answer.at(point);
            let largest = |values: &[Rat]| values.iter().map(|v| float(v).abs()).fold(0.0, f64::max);
            volts = volts.max(largest(potentials)).max(largest(voltages));
            amperes = amperes.max(largest(currents));
        }
        // where nothing flows, rounding still leaves a trace of what the largest resistance would carry
        if ohms > 0.0 {
            amperes = amperes.max(volts / ohms);
        }
        Scale { volts, amperes }
    }
}

struct Differences<'a> {
    circuit: &'a Circuit,
    scale: Scale,
    tolerance: Tolerance,
    list: Vec<String>,
}

impl Differences<'_> {
    /// One solution, or one connected set of them given as ranges.
    fn single(&mut self, analysis: &Analysis, case: &Case, answer: &Answer) {
        if case.solutions.len() != 1 {
            return self.list.push(format!("{} solutions are listed, expected 1", case.solutions.len()));
        }
        if case.residual.relative.is_nan() || case.residual.relative > 1e-9 {
            self.list.push(format!("the proof's own residual is {:e}", case.residual.relative));
        }
        let named = Named::new(analysis, &case.solutions[0]);
        self.counts(&case.solutions[0]);
        let every = (0..self.circuit.elements.len()).collect::<Vec<_>>();
        let nodes = (1..self.circuit.nodes.len()).collect::<Vec<_>>();
        self.part(&named, answer, &nodes, &every);
    }

    fn counts(&mut self, solution: &Solution) {
        let diodes = self.circuit.diodes().count();
        let open = self.circuit.elements.iter().filter(|e| matches!(e.kind, Kind::C)).count();
        let expected = (diodes, self.circuit.nodes.len() - 1, self.circuit.elements.len() - diodes - open);
        let got = (solution.diodes.len(), solution.nodes.len(), solution.branches.len());
        if got != expected {
            self.list.push(format!("diodes, nodes, branches listed: {got:?}, expected {expected:?}"));
        }
    }

    fn part(&mut self, named: &Named, answer: &Answer, nodes: &[usize], elements: &[usize]) {
        for &node in nodes {
            let name = self.circuit.nodes[node].clone();
            match named.node(&name) {
                Ok(result) => {
                    self.quantity("v", &name, result.voltage, answer.potential(node), self.scale.volts)
                }
                Err(problem) => self.list.push(problem),
            }
        }
        for &at in elements {
            let name = self.circuit.elements[at].name.clone();
            match self.circuit.elements[at].kind {
                Kind::C => {}
                Kind::D(_) => self.diode(named, answer, at, &name),
                _ => match named.branch(&name) {
                    Ok(result) => {
                        self.quantity("i", &name, result.current, answer.current(at), self.scale.amperes);
                    }
                    Err(problem) => self.list.push(problem),
                },
            }
        }
    }

    fn diode(&mut self, named: &Named, answer: &Answer, at: usize, name: &str) {
        let result = match named.diode(name) {
            Ok(result) => result,
            Err(problem) => return self.list.push(problem),
        };
        let expected = answer.current(at).state();
        if !same_state(result.state, expected) {
            self.list.push(format!("state({name}): got {:?}, expected {expected:?}", result.state));
        }
        self.quantity("i", name, result.current, answer.current(at), self.scale.amperes);
        self.quantity("v", name, result.voltage, answer.voltage(at), self.scale.volts);
    }

    fn quantity(&mut self, what: &str, name: &str, got: Quantity, expected: &Range, scale: f64) {
        let near = |got: f64, want: &Option<Rat>, unbounded: f64| match want {
            Some(want) => self.near(got, float(want), scale),
            None => got == unbounded,
        };
        let fits = match (got, expected.single()) {
            (Quantity::Known(value), Some(want)) => self.near(value, float(want), scale),
            (Quantity::Open(interval), None) => {
                near(interval.low, &expected.low, f64::NEG_INFINITY)
                    && near(interval.high, &expected.high, f64::INFINITY)
            }
            _ => false,
        };
        if !fits {
            self.list.push(format!("{what}({name}): got {}, expected {}", show(got), shown(expected)));
        }
    }

    fn near(&self, got: f64, want: f64, scale: f64) -> bool {
        (got - want).abs() <= self.tolerance.relative * want.abs() + self.tolerance.of_largest * scale
    }

    /// Isolated solutions: each must be listed exactly once, up to sixteen.
    fn several(&mut self, analysis: &Analysis, case: &Case, answer: &Answer) {
        let expected = answer.points.len().min(16);
        if case.solutions.len() != expected || case.truncated != (answer.points.len() > 16) {
            let truncated = if case.truncated { " (truncated)" } else { "" };
            let listed = case.solutions.len();
            return self.list.push(format!("{listed} solutions are listed{truncated}, expected {expected}"));
        }
        let mut missing: Vec<usize> = (0..answer.points.len()).collect();
        for solution in &case.solutions {
            let named = Named::new(analysis, solution);
            let fits = |at: &usize| self.differs_from_point(&named, answer, *at).is_empty();
            match missing.iter().position(fits) {
                Some(at) => {
                    missing.remove(at);
                }
                None => self.list.push("a listed solution is none of the consistent sets".to_owned()),
            }
        }
    }

    fn differs_from_point(&self, named: &Named, answer: &Answer, at: usize) -> Vec<String> {
        let single = |value: &Rat| Range { low: Some(value.clone()), high: Some(value.clone()) };
        let alone = Answer { ranges: answer.points[at].iter().map(single).collect(), ..answer.clone() };
        let mut found = Differences {
            circuit: self.circuit,
            scale: self.scale,
            tolerance: self.tolerance,
            list: Vec::new(),
        };
        let every = (0..self.circuit.elements.len()).collect::<Vec<_>>();
        let nodes = (1..self.circuit.nodes.len()).collect::<Vec<_>>();
        found.part(named, &alone, &nodes, &every);
        found.list
    }

    /// Parts that have a solution keep it beside a contradictory one.
    fn sound_parts(&mut self, analysis: &Analysis, case: &Case) {
        if self.circuit.has_controlled() {
            return;
        }
        let (parts, holders) = divide(self.circuit, Division::Direct);
        let contested = self.contested(&parts, &holders);
        // what the other parts push through a source of 0 V decides how much of it an ideal diode beside it may carry
        let pushes = |at: &usize| matches!(self.circuit.elements[*at].kind, Kind::I(_) | Kind::R(_));
        let fed = parts.iter().any(|part| part.nodes.is_empty() && part.elements.iter().any(pushes));
        let idle = self.idle_nodes();
        let touched: Vec<Vec<usize>> = parts.iter().map(|part| self.ends(part)).collect();
        let on_idle = |ends: &[usize]| ends.iter().any(|node| idle.contains(node));
        let ideal = |at: &usize| matches!(&self.circuit.elements[*at].kind, Kind::D(d) if d.drop.is_zero() && d.series.is_zero());
        for (number, part) in parts.iter().enumerate() {
            let others = touched.iter().enumerate().filter(|(other, _)| *other != number);
            let beside = part.elements.iter().any(ideal)
                && on_idle(&touched[number])
                && others.into_iter().any(|(_, ends)| on_idle(ends));
            if beside || part.nodes.is_empty() && fed && !idle.is_empty() {
                continue;
            }
            let alone = self.alone(part, &holders);
            let answer = solve(&alone);
            let ends =
                part.elements.iter().map(|&at| &self.circuit.elements[at]).flat_map(|e| [e.from, e.to]);
            if !answer.solvable() || ends.into_iter().any(|node| contested.contains(&node)) {
                continue;
            }
            let Some(solution) = case.solutions.first() else {
                self.list
                    .push(format!("no solution is listed although {} is sound", self.title(&part.elements)));
                continue;
            };
            let mut found = Differences {
                circuit: &alone,
                scale: Scale::of(&alone, &answer),
                tolerance: self.tolerance,
                list: Vec::new(),
            };
            let inside: Vec<usize> = (0..alone.elements.len())
                .filter(|&at| {
                    part.elements.iter().any(|&e| self.circuit.elements[e].name == alone.elements[at].name)
                })
                .collect();
            found.part(&Named::new(analysis, solution), &answer, &part.nodes, &inside);
            self.list.extend(found.list);
        }
    }

    fn ends(&self, part: &Part) -> Vec<usize> {
        let elements = part.elements.iter().map(|&at| &self.circuit.elements[at]);
        elements.flat_map(|e| [e.from, e.to]).collect()
    }

    /// Nodes at sources of 0 V.
    fn idle_nodes(&self) -> Vec<usize> {
        let idle = self.circuit.elements.iter().filter(|e| matches!(e.kind, Kind::V(v) if v.is_zero()));
        idle.flat_map(|e| [e.from, e.to]).filter(|&node| node != 0).collect()
    }

    fn alone(&self, part: &Part, holders: &[usize]) -> Circuit {
        let mut alone = self.circuit.clone();
        let mut at = 0;
        alone.elements.retain(|_| {
            at += 1;
            part.elements.contains(&(at - 1)) || holders.contains(&(at - 1))
        });
        alone
    }

    /// Nodes whose potential sources and shorts among themselves do not agree on: nobody can say what a part beside
    /// one should do.
    fn contested(&self, parts: &[Part], holders: &[usize]) -> Vec<usize> {
        let mut nodes = Vec::new();
        for part in parts {
            let elements = part.elements.iter().map(|&at| &self.circuit.elements[at]);
            let only_sources = elements.clone().all(|e| match &e.kind {
                Kind::V(_) | Kind::L => true,
                Kind::R(ohms) => ohms.is_zero(),
                _ => false,
            });
            if only_sources && !solve(&self.alone(part, holders)).solvable() {
                nodes.extend(elements.flat_map(|e| [e.from, e.to]).filter(|&node| node != 0));
            }
        }
        nodes
    }

    fn title(&self, elements: &[usize]) -> String {
        let names: Vec<&str> = elements.iter().map(|&at| self.circuit.elements[at].name.as_str()).collect();
        format!("the part of {}", names.join(", "))
    }
}

fn same_state(got: State, expected: StateWord) -> bool {
    let got = match got {
        State::Conducting => StateWord::Conducting,
        State::Blocking => StateWord::Blocking,
        State::Breakdown => StateWord::Breakdown,
        State::Open => StateWord::Open,
        State::NotEvaluated => return false,
    };
    got == expected
}

fn show(quantity: Quantity) -> String {
    match quantity {
        Quantity::Known(value) => format!("{value:e}"),
        Quantity::Open(interval) => format!("[{:e}, {:e}]", interval.low, interval.high),
        Quantity::Unknown => "not evaluated".to_owned(),
    }
}

fn shown(range: &Range) -> String {
    let end =
        |value: &Option<Rat>| value.as_ref().map_or("unbounded".to_owned(), |v| format!("{:e}", float(v)));
    match range.single() {
        Some(_) => end(&range.low),
        None => format!("[{}, {}]", end(&range.low), end(&range.high)),
    }
}

/// Both answers in full, for a person who looks for the mistake.
pub fn both(circuit: &Circuit, answer: &Answer, analysis: &Analysis) -> String {
    let mut text = format!("{}exact: {:?}\n", circuit.text(), acceptable_verdicts(circuit, answer));
    if answer.solvable() {
        for node in 1..circuit.nodes.len() {
            let _ = writeln!(text, "  v({}) = {}", circuit.nodes[node], shown(answer.potential(node)));
        }
        for (at, element) in circuit.elements.iter().enumerate() {
            let state = match element.kind {
                Kind::D(_) => format!("{:?} ", answer.current(at).state()),
                _ => String::new(),
            };
            let _ = writeln!(text, "  {}: {state}i = {}", element.name, shown(answer.current(at)));
        }
    }
    match nominal(analysis) {
        Ok(case) => got(&mut text, analysis, case),
        Err(problem) => text.push_str(&problem),
    }
    text
}

fn got(text: &mut String, analysis: &Analysis, case: &Case) {
    let causes: Vec<&str> = case.causes.iter().map(|c| c.text.as_str()).collect();
    let _ = writeln!(text, "kneewise: {:?} in {} solves {causes:?}", case.verdict, case.solves);
    for solution in &case.solutions {
        for node in &solution.nodes {
            let _ = writeln!(text, "  v({}) = {}", analysis.circuit.node_name(node.node), show(node.voltage));
        }
        for branch in &solution.branches {
            let name = analysis.circuit.element_name(branch.element);
            let _ = writeln!(text, "  {name}: i = {}", show(branch.current));
        }
        for diode in &solution.diodes {
            let name = analysis.circuit.element_name(diode.element);
            let _ = writeln!(text, "  {name}: {:?} i = {}", diode.state, show(diode.current));
        }
    }
}
