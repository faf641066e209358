//! Which pieces of a network are independent of each other, once the potentials that sources hold are taken as
//! given; and the verdicts that may stand over the whole.

use super::answer::{Answer, Verdict};
use crate::circuits::{Circuit, Kind};
use std::collections::BTreeSet;

/// What counts as held. The definitions say "held by voltage sources to ground" and leave the reach of that open,
/// so a verdict over the whole may follow any of these.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Division {
    /// The other end of a source that stands on ground.
    Direct,
    /// Everything that a chain of sources joins to ground.
    Chain,
    /// The same, shorts counted as sources of 0 V.
    Shorts,
}

/// One piece.
#[derive(Debug, Clone, Default)]
pub struct Part {
    /// Its nodes, those that hold its edge left out.
    pub nodes: Vec<usize>,
    /// Its elements, the sources that hold its edge left out.
    pub elements: Vec<usize>,
}

/// The pieces, and the sources that hold their edges.
pub fn divide(circuit: &Circuit, division: Division) -> (Vec<Part>, Vec<usize>) {
    let (held, holders) = held(circuit, division);
    let mut group: Vec<usize> = (0..circuit.nodes.len()).collect();
    if circuit.has_controlled() {
        group.iter_mut().for_each(|g| *g = 0);
    }
    for element in &circuit.elements {
        let (from, to) = (element.from, element.to);
        if matches!(element.kind, Kind::C) || held[from] || held[to] || group[from] == group[to] {
            continue;
        }
        let (keep, gone) = (group[from], group[to]);
        group.iter_mut().filter(|g| **g == gone).for_each(|g| *g = keep);
    }
    let mut parts = vec![Part::default(); circuit.nodes.len()];
    for node in (1..circuit.nodes.len()).filter(|&node| !held[node]) {
        parts[group[node]].nodes.push(node);
    }
    for (at, element) in circuit.elements.iter().enumerate() {
        match [element.from, element.to].into_iter().find(|&node| !held[node]) {
            _ if holders.contains(&at) => {}
            Some(inside) => parts[group[inside]].elements.push(at),
            None => parts.push(Part { nodes: Vec::new(), elements: vec![at] }),
        }
    }
    parts.retain(|part| !part.nodes.is_empty() || !part.elements.is_empty());
    (parts, holders)
}

fn held(circuit: &Circuit, division: Division) -> (Vec<bool>, Vec<usize>) {
    let mut held = vec![false; circuit.nodes.len()];
    held[0] = true;
    let holds = |kind: &Kind| match kind {
        Kind::V(_) => true,
        Kind::L => division == Division::Shorts,
        Kind::R(ohms) => division == Division::Shorts && ohms.is_zero(),
        _ => false,
    };
    let sources: Vec<usize> =
        (0..circuit.elements.len()).filter(|&at| holds(&circuit.elements[at].kind)).collect();
    if division == Division::Direct {
        let to_ground = |at: &usize| circuit.elements[*at].from == 0 || circuit.elements[*at].to == 0;
        let holders: Vec<usize> = sources.into_iter().filter(to_ground).collect();
        for &at in &holders {
            held[circuit.elements[at].from] = true;
            held[circuit.elements[at].to] = true;
        }
        return (held, holders);
    }
    loop {
        let before = held.clone();
        for &at in &sources {
            let (from, to) = (circuit.elements[at].from, circuit.elements[at].to);
            let either = held[from] || held[to];
            held[from] = either;
            held[to] = either;
        }
        if held == before {
            break;
        }
    }
    let holders = sources.into_iter().filter(|&at| held[circuit.elements[at].from]).collect();
    (held, holders)
}

/// The verdicts that agree with the definitions for a network with this solution set.
pub fn acceptable_verdicts(circuit: &Circuit, answer: &Answer) -> BTreeSet<Verdict> {
    if !answer.solvable() {
        return BTreeSet::from([Verdict::None]);
    }
    if !answer.continuum {
        return BTreeSet::from([if answer.points.len() == 1 { Verdict::Unique } else { Verdict::Several }]);
    }
    let over = |division| {
        let (parts, holders) = divide(circuit, division);
        let of_part = |part: &Part| {
            let shared = part.elements.iter().any(|&at| answer.current(at).single().is_none());
            let floating = part.nodes.iter().any(|&node| answer.potential(node).single().is_none());
            match (shared, floating) {
                (true, true) => Verdict::SharedFloating,
                (true, false) => Verdict::Shared,
                (false, true) => Verdict::Floating,
                (false, false) => Verdict::Unique,
            }
        };
        let edge = holders.iter().any(|&at| answer.current(at).single().is_none());
        let edge = if edge { Verdict::Shared } else { Verdict::Unique };
        // one part's open currents beside another's open voltages: the whole has both
        parts.iter().map(of_part).chain([edge]).fold(Verdict::Unique, |a, b| match (a, b) {
            (Verdict::Shared, Verdict::Floating) | (Verdict::Floating, Verdict::Shared) => {
                Verdict::SharedFloating
            }
            _ => a.max(b),
        })
    };
    [Division::Direct, Division::Chain, Division::Shorts].into_iter().map(over).collect()
}
