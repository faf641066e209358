//! Which states each diode of a flat circuit visits: over the conditions that its notes declare, proved by the exact
//! enumeration of `tests/oracle`; where a moving source meets a capacitor or an inductor, over time.

use super::march::{Branch, Law, Net, State, real_state};
use super::netlist::{Flat, Part};
use crate::circuits::decimal::Dec;
use crate::circuits::{self, Circuit, Element, Kind};
use crate::oracle::{self, Assumed, Division, StateWord};
use std::collections::{BTreeMap, BTreeSet};

/// States by diode.
pub type Visits = BTreeMap<String, BTreeSet<State>>;

/// One set of values.
#[derive(Debug, Clone, Default)]
pub struct Condition {
    pub sources: BTreeMap<String, f64>,
    pub on: BTreeMap<String, bool>,
    pub parameters: Vec<(String, f64)>,
    /// Moving sources at their greatest (true) or least.
    pub extreme: Option<bool>,
}

/// What the diodes visit; `None` where some condition has no solution.
pub fn visits(text: &str) -> Option<Visits> {
    let flat = Flat::read(text, &[]);
    let moving = flat.parts.iter().any(|p| p.shape.is_some());
    let remembers = flat.parts.iter().any(|p| "CL".contains(p.letter));
    let mut all = Visits::new();
    for condition in conditions(&flat, !(moving && remembers)) {
        let flat = Flat::read(text, &condition.parameters);
        let here =
            if moving && remembers { over_time(&flat, &condition)? } else { at_rest(&flat, &condition)? };
        for (name, states) in here {
            all.entry(name).or_default().extend(states);
        }
    }
    Some(all)
}

/// Nominal, the corners of the ranges, each transistor on and off, the extremes of what moves.
pub fn conditions(flat: &Flat, extremes: bool) -> Vec<Condition> {
    let mut list = vec![Condition::default()];
    for note in flat.notes("range") {
        let ends: Vec<f64> = note[2..].iter().filter_map(|w| super::netlist::number(w)).collect();
        let before = list.clone();
        for end in ends {
            list.extend(before.iter().cloned().map(|mut c| {
                if flat.parts.iter().any(|p| p.name == note[1]) {
                    c.sources.insert(note[1].clone(), end);
                } else {
                    c.parameters.push((note[1].clone(), end));
                }
                c
            }));
        }
    }
    for note in flat.notes("supply").filter(|n| n.len() > 3) {
        let ends: Vec<f64> = note[3].split("..").filter_map(super::netlist::number).collect();
        let before = list.clone();
        for end in ends {
            list.extend(before.iter().cloned().map(|mut c| {
                c.sources.insert(format!("supply {}", note[1]), end);
                c
            }));
        }
    }
    let said = |part: &Part| flat.notes("hold").find(|n| n[1] == part.name).map(|n| n[2].clone());
    let transistors: Vec<&Part> = flat.parts.iter().filter(|p| "QMJ".contains(p.letter)).collect();
    for part in &transistors {
        if let Some(word) = said(part).filter(|w| w != "both") {
            for condition in &mut list {
                condition.on.insert(part.name.clone(), word == "on");
            }
        }
    }
    // those not held are seen on and off together
    let free: Vec<&&Part> = transistors.iter().filter(|p| said(p).is_none_or(|w| w == "both")).collect();
    if !free.is_empty() {
        let before = std::mem::take(&mut list);
        for on in [false, true] {
            list.extend(before.iter().cloned().map(|mut c| {
                c.on.extend(free.iter().map(|p| (p.name.clone(), on)));
                c
            }));
        }
    }
    if extremes && flat.parts.iter().any(|p| p.shape.is_some()) {
        let before = list.clone();
        for end in [true, false] {
            list.extend(before.iter().cloned().map(|c| Condition { extreme: Some(end), ..c }));
        }
    }
    list
}

/// The network of one condition.
pub fn network(flat: &Flat, condition: &Condition) -> Option<Net> {
    let names: BTreeMap<String, usize> =
        flat.nodes().into_iter().enumerate().map(|(n, name)| (name, n + 1)).collect();
    let node = |name: &String| if name == "0" { 0 } else { names[name] };
    let mut net = Net { nodes: names.len() + 1, ..Net::default() };
    let fixed = fixed_potentials(flat, condition);
    for part in &flat.parts {
        let value = condition.sources.get(&part.name).copied().or(part.value);
        let n: Vec<usize> = part.nodes.iter().map(&node).collect();
        let heard =
            || flat.parts.iter().filter(|p| is_branch(p)).position(|p| Some(&p.name) == part.words.first());
        let law = match part.letter {
            'R' => Law::R(value?),
            'C' => Law::C(value?),
            'L' => Law::L(value?),
            'V' => Law::V(extreme(part, condition).or(value).unwrap_or(0.0)),
            'I' => Law::I(extreme(part, condition).or(value).unwrap_or(0.0)),
            'D' => diode(flat, part),
            'E' => Law::E(value?, n[2], n[3]),
            'G' => Law::G(value?, n[2], n[3]),
            'F' => Law::F(value?, heard()?),
            'H' => Law::H(value?, heard()?),
            'S' => {
                let model = flat.models.get(part.words.last()?)?;
                let control = fixed.get(&part.nodes[2])? - fixed.get(&part.nodes[3])?;
                let key = |k: &str| model.parameters.get(k).copied();
                let on = control > key("vt").unwrap_or(0.0);
                Law::R(if on { key("ron") } else { key("roff") }.unwrap_or(1.0))
            }
            'Q' | 'M' | 'J' => {
                let on = condition.on.get(&part.name).copied().unwrap_or(false);
                Law::R(if on { 1e-3 } else { 1e12 })
            }
            _ => continue,
        };
        let to = if "QMJ".contains(part.letter) { n[2] } else { n[1] };
        net.branches.push(Branch { name: part.name.clone(), from: n[0], to, law, shape: part.shape.clone() });
    }
    for note in flat.notes("supply") {
        let at = names.get(&super::netlist::node(&note[1]))?;
        let name = format!("supply {}", note[1]);
        let volts = condition.sources.get(&name).copied().or_else(|| super::netlist::number(&note[2]))?;
        net.branches.push(Branch { name, from: *at, to: 0, law: Law::V(volts), shape: None });
    }
    for part in flat.parts.iter().filter(|p| p.letter == 'K') {
        let coils: Vec<(usize, f64)> = part
            .words
            .iter()
            .filter_map(|w| {
                let at = net.branches.iter().position(|b| b.name == *w)?;
                let Law::L(henries) = net.branches[at].law else { return None };
                Some((at, henries))
            })
            .collect();
        for (i, a) in coils.iter().enumerate() {
            for b in &coils[i + 1..] {
                net.mutual.push((a.0, b.0, part.value? * (a.1 * b.1).sqrt()));
            }
        }
    }
    Some(net)
}

fn is_branch(part: &Part) -> bool {
    !matches!(part.letter, 'K' | 'X' | 'W')
}

fn extreme(part: &Part, condition: &Condition) -> Option<f64> {
    let (kind, n) = part.shape.as_ref()?;
    match (kind.as_str(), condition.extreme) {
        (_, None) => Some(n[0]),
        ("sin", Some(high)) => Some(n[0] + if high { n[1].abs() } else { -n[1].abs() }),
        (_, Some(high)) => Some(if high { n[0].max(n[1]) } else { n[0].min(n[1]) }),
    }
}

/// Potentials that sources to ground hold.
fn fixed_potentials(flat: &Flat, condition: &Condition) -> BTreeMap<String, f64> {
    let mut fixed = BTreeMap::from([("0".to_owned(), 0.0)]);
    for part in flat.parts.iter().filter(|p| p.letter == 'V') {
        let value = condition.sources.get(&part.name).copied().or(extreme(part, condition)).or(part.value);
        let value = value.unwrap_or(0.0);
        if part.nodes[1] == "0" {
            fixed.insert(part.nodes[0].clone(), value);
        } else if part.nodes[0] == "0" {
            fixed.insert(part.nodes[1].clone(), -value);
        }
    }
    fixed
}

/// Constant drop at 10 mA, rounded to millivolts, from the note, the material or IS and N at 27 degrees; common practice.
fn diode(flat: &Flat, part: &Part) -> Law {
    let model_name = part.words.first().cloned().unwrap_or_default();
    let model = flat.models.get(&model_name);
    let key = |k: &str| model.and_then(|m| m.parameters.get(k).copied());
    let noted = |word: &str| {
        let about = |n: &&Vec<String>| n[1] == part.name || n[1] == model_name;
        flat.notes(word).find(about).map(|n| n[2].clone())
    };
    let material = noted("made-of").map(|word| match word.as_str() {
        "schottky" | "germanium" => 0.3,
        "ir-led" => 1.3,
        "red-led" => 1.8,
        "amber-led" => 2.0,
        "green-led" => 2.3,
        "blue-led" => 3.1,
        "white-led" | "ingan-green-led" => 3.0,
        _ => 0.7,
    });
    let law = || key("is").map(|is| key("n").unwrap_or(1.0) * 0.025_865 * (1e-2 / (is * part.area)).ln_1p());
    let drop =
        noted("drop").and_then(|w| super::netlist::number(&w)).or_else(law).or(material).unwrap_or(0.7);
    let drop = (drop * 1e3).round() / 1e3;
    Law::D { drop, breakdown: key("bv"), series: key("rs").unwrap_or(0.0) / part.area }
}

/// States at rest, each independent piece proved exactly.
pub fn at_rest(flat: &Flat, condition: &Condition) -> Option<Visits> {
    let net = network(flat, condition)?;
    let guess = net.rest(&[]);
    let circuit = exact(&net);
    let (parts, holders) = oracle::divide(&circuit, Division::Chain);
    let mut visits = Visits::new();
    for piece in parts {
        let mut elements: Vec<usize> = holders.clone();
        elements.extend(&piece.elements);
        elements.sort_unstable();
        let diodes: Vec<usize> =
            elements.iter().copied().filter(|&at| matches!(circuit.elements[at].kind, Kind::D(_))).collect();
        if diodes.is_empty() {
            continue;
        }
        let mut sub = Circuit {
            title: String::new(),
            nodes: circuit.nodes.clone(),
            elements: elements.iter().map(|&at| circuit.elements[at].clone()).collect(),
        };
        sub.compact();
        let states = proved(&sub, &diodes, guess.as_ref())?;
        for (at, state) in diodes.iter().zip(states) {
            visits.entry(net.branches[*at].name.clone()).or_default().insert(state);
        }
    }
    Some(visits)
}

/// The states of one piece: those proposed, where the exact laws bear them out; else all assignments are tried.
fn proved(sub: &Circuit, diodes: &[usize], guess: Option<&super::march::Answer>) -> Option<Vec<State>> {
    let positions: Vec<usize> = sub.diodes().map(|(at, _)| at).collect();
    let read = |answer: &oracle::Answer| -> Vec<State> {
        let state = |&at: &usize| match answer.current(at).state() {
            StateWord::Conducting => State::Conducting,
            StateWord::Breakdown => State::Breakdown,
            StateWord::Blocking | StateWord::Open => State::Blocking,
        };
        positions.iter().map(state).collect()
    };
    if let Some(guess) = guess {
        let assumed: Vec<Assumed> = diodes
            .iter()
            .map(|&at| match real_state(guess, at) {
                State::Conducting => Assumed::Conducting,
                State::Blocking => Assumed::Blocking,
                State::Breakdown => Assumed::Breakdown,
            })
            .collect();
        let answer = oracle::with_states(sub, &assumed);
        if answer.solvable() {
            return Some(read(&answer));
        }
    }
    if diodes.len() > MOST {
        return None;
    }
    let answer = oracle::solve(sub);
    answer.solvable().then(|| read(&answer))
}

/// Diodes of one piece up to which all assignments are tried.
const MOST: usize = 9;

fn over_time(flat: &Flat, condition: &Condition) -> Option<Visits> {
    let net = network(flat, condition)?;
    let period = |(kind, n): &(String, Vec<f64>)| if kind == "sin" { 1.0 / n[2] } else { n[6] };
    let longest = net.branches.iter().filter_map(|b| b.shape.as_ref()).map(period).fold(0.0, f64::max);
    let seen = net.visits(longest, 24)?;
    let diodes = net.branches.iter().zip(seen).filter(|(b, _)| matches!(b.law, Law::D { .. }));
    Some(diodes.map(|(b, s)| (b.name.clone(), s)).collect())
}

/// The same network in exact decimals.
fn exact(net: &Net) -> Circuit {
    let mut circuit = Circuit::with_nodes("judge", net.nodes - 1);
    for branch in &net.branches {
        let kind = match &branch.law {
            Law::R(v) => Kind::R(decimal(*v)),
            Law::V(v) => Kind::V(decimal(*v)),
            Law::I(v) => Kind::I(decimal(*v)),
            Law::C(_) => Kind::C,
            Law::L(_) => Kind::L,
            Law::D { drop, breakdown, series } => Kind::D(circuits::Diode {
                drop: decimal(*drop),
                breakdown: breakdown.map(decimal),
                series: decimal(*series),
            }),
            Law::E(g, c, d) => Kind::E { gain: decimal(*g), control: (*c, *d) },
            Law::G(g, c, d) => Kind::G { gain: decimal(*g), control: (*c, *d) },
            Law::F(g, at) => Kind::F { gain: decimal(*g), control: net.branches[*at].name.clone() },
            Law::H(g, at) => Kind::H { gain: decimal(*g), control: net.branches[*at].name.clone() },
        };
        circuit.elements.push(Element { name: branch.name.clone(), from: branch.from, to: branch.to, kind });
    }
    circuit
}

/// The shortest decimal of a double.
fn decimal(value: f64) -> Dec {
    let text = format!("{value:e}");
    let (digits, exponent) = text.split_once('e').unwrap_or((&text, "0"));
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let places = digits.split_once('.').map_or(0, |(_, p)| p.len()) as i32;
    let digits: i64 = digits.replace('.', "").parse().unwrap_or(0);
    Dec::new(digits, exponent - places)
}
