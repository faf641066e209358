//! Which mutants are no mistakes: the same circuit under other names, or another legal circuit in which every diode
//! visits the same states. Decided without kneewise.

use super::isomorphic;
use super::netlist::Flat;
use super::states::{Visits, visits};
use std::collections::{BTreeMap, BTreeSet};

/// What a mutant is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Judgement {
    /// Electrically the same.
    Equivalent,
    /// Another legal circuit with the same states: only its author knows.
    Intent,
    /// To be caught.
    Mistake,
}

/// A clean netlist, read once.
pub struct Clean {
    flat: Flat,
    visits: Option<Visits>,
    /// Nodes that one element alone touches in the clean file already.
    loose: BTreeSet<String>,
}

impl Clean {
    pub fn of(text: &str) -> Clean {
        let flat = Flat::read(text, &[]);
        let loose = loose(&flat);
        Clean { visits: visits(text), loose, flat }
    }

    pub fn judge(&self, mutant: &str) -> Judgement {
        let flat = Flat::read(mutant, &[]);
        if flat.broken.is_some() {
            return Judgement::Mistake;
        }
        if isomorphic::same(&self.flat, &flat) {
            return Judgement::Equivalent;
        }
        if !self.legal(&flat) {
            return Judgement::Mistake;
        }
        let (Some(before), Some(after)) = (&self.visits, visits(mutant)) else { return Judgement::Mistake };
        // a diode that was taken out visits nothing
        let same = after.iter().all(|(name, states)| before.get(name).is_none_or(|b| b == states));
        if same { Judgement::Intent } else { Judgement::Mistake }
    }

    /// A circuit that nobody could find fault with by its wiring alone: it has ground, no node ends at one element, no
    /// element lies across one node, and every node has a way for direct current to ground.
    fn legal(&self, flat: &Flat) -> bool {
        let nodes = flat.nodes();
        let grounded = flat.parts.iter().any(|p| p.nodes.iter().any(|n| n == "0"));
        let shorted = flat.parts.iter().any(|p| p.nodes.len() == 2 && p.nodes[0] == p.nodes[1]);
        if !grounded || shorted || loose(flat).iter().any(|n| !self.loose.contains(n)) {
            return false;
        }
        let held = held(flat);
        nodes.iter().all(|n| held.contains(n))
    }
}

/// Nodes that one element alone touches, those that notes look at left out.
fn loose(flat: &Flat) -> BTreeSet<String> {
    let mut touching: BTreeMap<&String, BTreeSet<&String>> = BTreeMap::new();
    for part in &flat.parts {
        for node in &part.nodes {
            touching.entry(node).or_default().insert(&part.name);
        }
    }
    let noted: Vec<&String> = flat.notes.iter().flatten().collect();
    let single = touching.into_iter().filter(|(n, parts)| n.as_str() != "0" && parts.len() == 1);
    single.map(|(n, _)| n.clone()).filter(|n| !noted.contains(&n)).collect()
}

/// Nodes with a way for direct current to ground.
fn held(flat: &Flat) -> BTreeSet<String> {
    let mut held = BTreeSet::from(["0".to_owned()]);
    for note in flat.notes("supply") {
        held.insert(super::netlist::node(&note[1]));
    }
    loop {
        let before = held.len();
        for part in &flat.parts {
            let through: &[usize] = match part.letter {
                'C' | 'I' | 'G' | 'F' | 'K' => &[],
                'Q' | 'J' => &[0, 1, 2],
                'M' => &[0, 2],
                _ => &[0, 1],
            };
            if through.iter().any(|&p| held.contains(&part.nodes[p])) {
                held.extend(through.iter().map(|&p| part.nodes[p].clone()));
            }
        }
        if held.len() == before {
            break held;
        }
    }
}
