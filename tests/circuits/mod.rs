//! Made-up networks as plain data, and their netlist text: what the tests, the benches and the generator share.
//! Nothing here solves anything or knows kneewise.

// each user (tests, benches, examples) takes its own share of this
#![allow(dead_code)]

pub mod decimal;
pub mod dependent;
pub mod families;
pub mod large;
pub mod random;
pub mod seed;

use decimal::Dec;
use std::fmt::Write;

/// A diode of the constant-drop model.
#[derive(Debug, Clone, PartialEq)]
pub struct Diode {
    /// Drop, volts, ≥ 0.
    pub drop: Dec,
    /// Magnitude of the breakdown voltage, volts, > 0.
    pub breakdown: Option<Dec>,
    /// Series resistance, ohms, ≥ 0.
    pub series: Dec,
}

/// What an element does. Currents flow from its first node through it to its second.
#[derive(Debug, Clone, PartialEq)]
pub enum Kind {
    /// Ohms; 0 is a short.
    R(Dec),
    /// Volts, first node minus second.
    V(Dec),
    /// Amperes.
    I(Dec),
    /// Anode first.
    D(Diode),
    /// Open.
    C,
    /// Short.
    L,
    /// Volts for each volt between two nodes.
    E { gain: Dec, control: (usize, usize) },
    /// Amperes for each volt between two nodes.
    G { gain: Dec, control: (usize, usize) },
    /// Amperes for each ampere through the voltage source of that name.
    F { gain: Dec, control: String },
    /// Volts for each ampere through the voltage source of that name.
    H { gain: Dec, control: String },
}

/// One element.
#[derive(Debug, Clone, PartialEq)]
pub struct Element {
    /// Name with its letter.
    pub name: String,
    /// First node (number in [`Circuit::nodes`]).
    pub from: usize,
    /// Second node.
    pub to: usize,
    /// What it does.
    pub kind: Kind,
}

/// A circuit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Circuit {
    /// First line of the netlist.
    pub title: String,
    /// Names of the nodes; number 0 is ground.
    pub nodes: Vec<String>,
    /// The elements in the order of the text.
    pub elements: Vec<Element>,
}

impl Circuit {
    /// Ground and `count` more nodes, `n1`, `n2`, …
    pub fn with_nodes(title: impl Into<String>, count: usize) -> Self {
        let nodes = std::iter::once("0".to_owned()).chain((1..=count).map(|n| format!("n{n}"))).collect();
        Circuit { title: title.into(), nodes, elements: Vec::new() }
    }

    /// A further node.
    pub fn node(&mut self) -> usize {
        self.nodes.push(format!("n{}", self.nodes.len()));
        self.nodes.len() - 1
    }

    /// Adds an element, named by its letter and its number in the circuit; gives its position.
    pub fn add(&mut self, from: usize, to: usize, kind: Kind) -> usize {
        let name = format!("{}{}", kind.letter(), self.elements.len() + 1);
        self.elements.push(Element { name, from, to, kind });
        self.elements.len() - 1
    }

    /// A resistor, ohms.
    pub fn r(&mut self, from: usize, to: usize, ohms: impl Into<Dec>) -> usize {
        self.add(from, to, Kind::R(ohms.into()))
    }

    /// A voltage source, volts.
    pub fn v(&mut self, from: usize, to: usize, volts: impl Into<Dec>) -> usize {
        self.add(from, to, Kind::V(volts.into()))
    }

    /// A current source, amperes.
    pub fn i(&mut self, from: usize, to: usize, amperes: impl Into<Dec>) -> usize {
        self.add(from, to, Kind::I(amperes.into()))
    }

    /// A diode without breakdown and series resistance.
    pub fn d(&mut self, anode: usize, cathode: usize, drop: impl Into<Dec>) -> usize {
        self.diode(anode, cathode, Diode { drop: drop.into(), breakdown: None, series: Dec::ZERO })
    }

    /// A diode.
    pub fn diode(&mut self, anode: usize, cathode: usize, diode: Diode) -> usize {
        self.add(anode, cathode, Kind::D(diode))
    }

    /// The diodes: position and data.
    pub fn diodes(&self) -> impl Iterator<Item = (usize, &Diode)> {
        self.elements.iter().enumerate().filter_map(|(at, e)| match &e.kind {
            Kind::D(diode) => Some((at, diode)),
            _ => None,
        })
    }

    /// Whether any element listens to another place.
    pub fn has_controlled(&self) -> bool {
        self.elements.iter().any(|e| !e.kind.controls().is_empty() || e.kind.listens().is_some())
    }

    /// Whether nothing in it is controlled and no resistance is negative.
    pub fn is_passive(&self) -> bool {
        let negative = |kind: &Kind| matches!(kind, Kind::R(ohms) if ohms.digits < 0);
        !self.has_controlled() && !self.elements.iter().any(|e| negative(&e.kind))
    }

    /// Drops the nodes that nothing touches.
    pub fn compact(&mut self) {
        let mut used = vec![false; self.nodes.len()];
        used[0] = true;
        for element in &self.elements {
            for node in [element.from, element.to].into_iter().chain(element.kind.controls()) {
                used[node] = true;
            }
        }
        let mut number = vec![0; used.len()];
        let mut next = 0;
        for (node, used) in used.iter().enumerate() {
            number[node] = next;
            next += usize::from(*used);
        }
        for element in &mut self.elements {
            element.from = number[element.from];
            element.to = number[element.to];
            if let Kind::E { control, .. } | Kind::G { control, .. } = &mut element.kind {
                *control = (number[control.0], number[control.1]);
            }
        }
        let mut used = used.into_iter();
        self.nodes.retain(|_| used.next() == Some(true));
    }

    /// The netlist. In small circuits every diode has a model of its own, and notes on diodes and on models take
    /// turns; in large ones equal diodes share a model.
    pub fn text(&self) -> String {
        let mut text = format!("{}\n", self.title);
        let shared = self.elements.len() > 100;
        let mut models: Vec<&Diode> = Vec::new();
        for (at, element) in self.elements.iter().enumerate() {
            match &element.kind {
                Kind::D(diode) if shared => {
                    let known = models.iter().position(|other| *other == diode);
                    let number = known.unwrap_or(models.len());
                    self.line(&mut text, element, &format!("DK{number}"));
                    if known.is_none() {
                        models.push(diode);
                        model(&mut text, &format!("DK{number}"), &format!("DK{number}"), diode);
                    }
                }
                Kind::D(diode) => {
                    let name = format!("M{}", element.name);
                    self.line(&mut text, element, &name);
                    model(&mut text, &name, if at % 2 == 0 { &name } else { &element.name }, diode);
                }
                _ => self.line(&mut text, element, ""),
            }
        }
        text.push_str(".end\n");
        text
    }

    fn line(&self, text: &mut String, element: &Element, model: &str) {
        let Element { name, from, to, kind } = element;
        let node = |n: usize| self.nodes[n].as_str();
        let _ = write!(text, "{name} {} {} ", node(*from), node(*to));
        let _ = match kind {
            Kind::R(value) | Kind::V(value) | Kind::I(value) => writeln!(text, "{value}"),
            Kind::C => writeln!(text, "1u"),
            Kind::L => writeln!(text, "1m"),
            Kind::E { gain, control } | Kind::G { gain, control } => {
                writeln!(text, "{} {} {gain}", node(control.0), node(control.1))
            }
            Kind::F { gain, control } | Kind::H { gain, control } => writeln!(text, "{control} {gain}"),
            Kind::D(_) => writeln!(text, "{model}"),
        };
    }
}

fn model(text: &mut String, name: &str, noted: &str, diode: &Diode) {
    let _ = write!(text, ".model {name} D(RS={}", diode.series);
    if let Some(breakdown) = &diode.breakdown {
        let _ = write!(text, " BV={breakdown}");
    }
    let _ = writeln!(text, ")\n*@ drop {noted} {}", diode.drop);
}

impl Kind {
    /// First letter of the element's name.
    pub fn letter(&self) -> char {
        match self {
            Kind::R(_) => 'R',
            Kind::V(_) => 'V',
            Kind::I(_) => 'I',
            Kind::D(_) => 'D',
            Kind::C => 'C',
            Kind::L => 'L',
            Kind::E { .. } => 'E',
            Kind::G { .. } => 'G',
            Kind::F { .. } => 'F',
            Kind::H { .. } => 'H',
        }
    }

    /// The nodes it listens to.
    pub fn controls(&self) -> Vec<usize> {
        match self {
            Kind::E { control, .. } | Kind::G { control, .. } => vec![control.0, control.1],
            _ => Vec::new(),
        }
    }

    /// The source whose current it listens to.
    pub fn listens(&self) -> Option<&str> {
        match self {
            Kind::F { control, .. } | Kind::H { control, .. } => Some(control),
            _ => None,
        }
    }
}
