//! Worked examples printed in textbooks and course pages: states, every printed number within its printed
//! precision, and full agreement with the model's own solution of the same circuit. `tests/examples/dc.json` names
//! for each its source, how it was found (`found_by`: read or memory) and whether its wiring stood in the text or was
//! inferred from the arithmetic (`topology_from`).

use crate::circuits::decimal::Dec;
use crate::circuits::{Circuit, Diode, Kind};
use crate::compare::{CLOSE, differences};
use crate::oracle::{self, Range, StateWord, float};
use crate::run::{self, Named, nominal};
use kneewise::complementarity::{Quantity, Verdict};
use serde::Deserialize;
use serde_json::Value;
use std::collections::BTreeMap;

#[derive(Debug, Deserialize)]
#[allow(dead_code)] // the file also tells a reader what no test needs
struct Example {
    id: String,
    family: String,
    title: String,
    source: String,
    found_by: String,
    topology_from: String,
    printed_precision: String,
    degenerate: bool,
    netlist: Vec<String>,
    printed: Printed,
    model: Model,
}

/// Numbers as printed, each with half of its last printed place.
#[derive(Debug, Deserialize)]
struct Printed {
    diodes: BTreeMap<String, PrintedDiode>,
    nodes: BTreeMap<String, (f64, f64)>,
    branches: BTreeMap<String, (f64, f64)>,
}

#[derive(Debug, Deserialize)]
struct PrintedDiode {
    state: Option<String>,
    i: Option<(f64, f64)>,
    v: Option<(f64, f64)>,
}

/// The constant-drop model solved apart from this project, to ten digits: `i:NAME`, `v:NAME`; a pair is an interval.
#[derive(Debug, Deserialize)]
struct Model {
    states: BTreeMap<String, String>,
    values: BTreeMap<String, Value>,
}

impl Example {
    fn text(&self) -> String {
        self.netlist.join("\n") + "\n"
    }
}

fn examples() -> Vec<Example> {
    let list: Vec<Example> =
        serde_json::from_str(include_str!("../examples/dc.json")).expect("dc.json is well formed");
    assert_eq!(list.len(), 82, "worked examples went missing");
    list
}

/// Runs a check over all examples and tells which failed and why.
fn each(check: &dyn Fn(&Example) -> Vec<String>) {
    let mut failures = Vec::new();
    for example in examples() {
        let found = check(&example);
        if !found.is_empty() {
            let Example { id, title, source, .. } = &example;
            failures.push(format!("{id}: {title} ({source})\n{}  {}", example.text(), found.join("\n  ")));
        }
    }
    assert!(
        failures.is_empty(),
        "{} of 82 worked examples differ:\n\n{}",
        failures.len(),
        failures.join("\n\n")
    );
}

#[test]
fn worked_examples_come_out_as_printed() {
    each(&|example| {
        let analysis = run::states(&example.text());
        let solution = match nominal(&analysis) {
            Ok(case) if case.solutions.len() == 1 => {
                let fits = match case.verdict {
                    Verdict::Unique => !example.degenerate,
                    Verdict::Shared | Verdict::Floating | Verdict::SharedFloating => example.degenerate,
                    _ => false,
                };
                if !fits {
                    return vec![format!("verdict: found {:?}", case.verdict)];
                }
                &case.solutions[0]
            }
            Ok(case) => return vec![format!("{:?} with {} solutions", case.verdict, case.solutions.len())],
            Err(problem) => return vec![problem],
        };
        let mut checks = Checks { named: Named::new(&analysis, solution), list: Vec::new() };
        checks.printed(example);
        checks.model(example);
        checks.list
    });
}

struct Checks<'a> {
    named: Named<'a>,
    list: Vec<String>,
}

impl Checks<'_> {
    fn printed(&mut self, example: &Example) {
        for (name, diode) in &example.printed.diodes {
            if let Some(state) = diode.state.as_ref().filter(|_| !example.degenerate) {
                self.state(name, state, "printed");
            }
            for (what, printed) in [("i", diode.i), ("v", diode.v)] {
                if let Some(printed) = printed {
                    self.is_printed(&format!("{what}:{name}"), printed);
                }
            }
        }
        for (name, printed) in &example.printed.nodes {
            self.is_printed(&format!("v:{name}"), *printed);
        }
        for (name, printed) in &example.printed.branches {
            self.is_printed(&format!("i:{name}"), *printed);
        }
    }

    /// States, and values to 1e-9; a zero to 1e-12 (all values here are between microamperes and tens of volts).
    fn model(&mut self, example: &Example) {
        for (name, state) in example.model.states.iter().filter(|_| !example.degenerate) {
            self.state(name, state, "the model says");
        }
        for (key, value) in &example.model.values {
            let near = |got: f64, want: f64| (got - want).abs() <= 1e-9 * want.abs() + 1e-12;
            let number = |value: &Value| value.as_f64().unwrap_or(f64::NAN);
            let got = self.quantity(key);
            let fits = match (got.clone(), value) {
                (Ok(Quantity::Known(got)), Value::Number(_)) => near(got, number(value)),
                // the source picked one point of an open quantity
                (Ok(Quantity::Open(open)), Value::Number(_)) => {
                    let pick = number(value);
                    example.degenerate && open.low - 1e-12 <= pick && pick <= open.high + 1e-12
                }
                (Ok(Quantity::Open(open)), Value::Array(ends)) if ends.len() == 2 => {
                    near(open.low, number(&ends[0])) && near(open.high, number(&ends[1]))
                }
                _ => false,
            };
            if !fits {
                self.list.push(format!("{key}: found {got:?}, the model says {value}"));
            }
        }
    }

    fn state(&mut self, name: &str, expected: &str, who: &str) {
        match self.named.diode(name) {
            Ok(diode) if diode.state.word() == expected => {}
            Ok(diode) => self.list.push(format!("{name}: found {}, {who} {expected}", diode.state.word())),
            Err(problem) => self.list.push(problem),
        }
    }

    fn is_printed(&mut self, key: &str, (printed, tolerance): (f64, f64)) {
        let tolerance = tolerance * (1.0 + 1e-9);
        let fits = match self.quantity(key) {
            Ok(Quantity::Known(value)) => (value - printed).abs() <= tolerance,
            Ok(Quantity::Open(open)) => open.low - tolerance <= printed && printed <= open.high + tolerance,
            _ => false,
        };
        if !fits {
            let got = self.quantity(key);
            self.list.push(format!("{key}: found {got:?}, printed {printed} ± {tolerance:e}"));
        }
    }

    fn quantity(&self, key: &str) -> Result<Quantity, String> {
        let (what, name) = key.split_once(':').ok_or(key)?;
        let is_diode = name.starts_with('D');
        match (what, is_diode) {
            ("i", true) => Ok(self.named.diode(name)?.current),
            ("v", true) => Ok(self.named.diode(name)?.voltage),
            ("i", false) => Ok(self.named.branch(name)?.current),
            _ => Ok(self.named.node(name)?.voltage),
        }
    }
}

/// The enumeration itself against the same examples, so that the random networks stand on printed ground too.
#[test]
fn the_enumeration_agrees_with_the_worked_examples() {
    each(&|example| {
        let circuit = read(&example.netlist);
        let answer = oracle::solve(&circuit);
        if !answer.solvable() {
            return vec!["no solution was enumerated".to_owned()];
        }
        let mut list = Vec::new();
        for (key, value) in &example.model.values {
            let (what, name) = key.split_once(':').expect("keys are i:NAME or v:NAME");
            let element = circuit.elements.iter().position(|e| e.name == name);
            let range = match (what, element) {
                ("i", Some(at)) => answer.current(at),
                (_, Some(at)) => answer.voltage(at),
                _ => answer.potential(circuit.nodes.iter().position(|n| n == name).expect("a node")),
            };
            if !agrees(range, value, example.degenerate) {
                list.push(format!("{key}: enumerated {range:?}, the model says {value}"));
            }
        }
        for (name, state) in example.model.states.iter().filter(|_| !example.degenerate) {
            let at = circuit.elements.iter().position(|e| e.name == *name).expect("a diode");
            let word = match answer.current(at).state() {
                StateWord::Conducting => "conducting",
                StateWord::Blocking => "blocking",
                StateWord::Breakdown => "breakdown",
                StateWord::Open => "open",
            };
            if word != state {
                list.push(format!("{name}: enumerated {word}, the model says {state}"));
            }
        }
        list
    });
}

fn agrees(range: &Range, value: &Value, degenerate: bool) -> bool {
    let low = range.low.as_ref().map_or(f64::NEG_INFINITY, float);
    let high = range.high.as_ref().map_or(f64::INFINITY, float);
    let near = |got: f64, want: &Value| {
        want.as_f64().is_some_and(|want| (got - want).abs() <= 1e-9 * want.abs() + 1e-12)
    };
    match value {
        Value::Array(ends) => near(low, &ends[0]) && near(high, &ends[1]),
        _ if degenerate => value.as_f64().is_some_and(|pick| low - 1e-12 <= pick && pick <= high + 1e-12),
        _ => near(low, value) && near(high, value),
    }
}

/// Reads the few forms that the examples use, apart from kneewise's own reader; anything else stops the test.
fn read(netlist: &[String]) -> Circuit {
    let mut circuit =
        Circuit { title: netlist[0].clone(), nodes: vec!["0".to_owned()], elements: Vec::new() };
    let mut drops: BTreeMap<&str, Dec> = BTreeMap::new();
    let mut breakdowns: BTreeMap<&str, Dec> = BTreeMap::new();
    for line in &netlist[1..] {
        match line.split_whitespace().collect::<Vec<_>>()[..] {
            ["*@", "drop", name, volts] => drops.extend([(name, decimal(volts))]),
            [".model", _, "D"] | [".end"] => {}
            [".model", name, rest] => {
                let volts = rest.strip_prefix("D(BV=").and_then(|r| r.strip_suffix(')')).expect("D(BV=…)");
                breakdowns.insert(name, decimal(volts));
            }
            [name, from, to, _] if name.starts_with(['R', 'V', 'I', 'D']) => {
                let ends = [from, to].map(|node| place(&mut circuit.nodes, node));
                let kind = Kind::R(Dec::ZERO);
                circuit.elements.push(crate::circuits::Element {
                    name: name.to_owned(),
                    from: ends[0],
                    to: ends[1],
                    kind,
                });
            }
            _ => panic!("the examples' reader does not know `{line}`"),
        }
    }
    let lines = netlist[1..].iter().filter(|line| line.starts_with(['R', 'V', 'I', 'D']));
    for (element, line) in circuit.elements.iter_mut().zip(lines) {
        let last = line.split_whitespace().next_back().expect("a value or model");
        element.kind = match element.name.as_bytes()[0] {
            b'R' => Kind::R(decimal(last)),
            b'V' => Kind::V(decimal(last)),
            b'I' => Kind::I(decimal(last)),
            _ => Kind::D(Diode {
                drop: drops[last],
                breakdown: breakdowns.get(last).copied(),
                series: Dec::ZERO,
            }),
        };
    }
    circuit
}

fn place(nodes: &mut Vec<String>, name: &str) -> usize {
    nodes.iter().position(|node| node == name).unwrap_or_else(|| {
        nodes.push(name.to_owned());
        nodes.len() - 1
    })
}

/// `-4.7k` and the like.
fn decimal(text: &str) -> Dec {
    let (number, power) = match text.strip_suffix('k') {
        Some(number) => (number, 3),
        None => text.strip_suffix('m').map_or((text, 0), |number| (number, -3)),
    };
    let places = number.split_once('.').map_or(0, |(_, part)| part.len());
    let digits = number.replace('.', "").parse().expect("a number");
    Dec::new(digits, power - i32::try_from(places).expect("few places"))
}

/// The same examples once more, quantity by quantity against the exact enumeration.
#[test]
fn worked_examples_agree_with_the_enumeration_in_every_quantity() {
    each(&|example| {
        let circuit = read(&example.netlist);
        differences(&circuit, &oracle::solve(&circuit), &run::states(&example.text()), CLOSE)
    });
}
