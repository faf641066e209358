//! Which element of the old revision is which of the new: by name, and what is left by what it joins.

use super::nodes::Nodes;
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use std::collections::{BTreeMap, BTreeSet, VecDeque};

/// An element of both revisions.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Pair {
    pub old: ElementId,
    pub new: ElementId,
    /// A part that works both ways is written the other way round.
    pub swapped: bool,
    /// It has another name.
    pub renamed: bool,
}

/// Everything that is in both revisions, and what is in one only.
#[derive(Debug, Default)]
pub(super) struct Pairs {
    pub elements: Vec<Pair>,
    pub nodes: Nodes,
    pub gone: Vec<ElementId>,
    pub added: Vec<ElementId>,
    by_old: BTreeMap<ElementId, usize>,
}

impl Pairs {
    /// Matches two circuits.
    pub fn of(old: &Circuit, new: &Circuit) -> Self {
        let mut pairs = Pairs::default();
        let mut by_name: BTreeMap<(u8, String), VecDeque<ElementId>> = BTreeMap::new();
        for (id, element) in new.elements() {
            by_name.entry((element.letter, new.element_name(id).to_lowercase())).or_default().push_back(id);
        }
        for (id, element) in old.elements() {
            let key = (element.letter, old.element_name(id).to_lowercase());
            let found = by_name.get_mut(&key).and_then(VecDeque::pop_front);
            match found {
                Some(other) => pairs.push(id, other, false),
                None => pairs.gone.push(id),
            }
        }
        pairs.added = by_name.into_values().flatten().collect();
        pairs.added.sort();
        pairs.nodes = Nodes::vote(old, new, &pairs.elements);
        pairs.match_by_wiring(old, new, true);
        pairs.match_by_wiring(old, new, false);
        pairs.nodes = Nodes::vote(old, new, &pairs.elements);
        for pair in &mut pairs.elements {
            pair.swapped = is_swapped(old, new, &pairs.nodes, pair);
        }
        pairs.elements.sort_by_key(|p| p.new);
        pairs.by_old = pairs.elements.iter().enumerate().map(|(n, p)| (p.old, n)).collect();
        pairs
    }

    /// The pair of an old element.
    pub fn of_old(&self, old: ElementId) -> Option<&Pair> {
        self.by_old.get(&old).and_then(|&n| self.elements.get(n))
    }

    fn push(&mut self, old: ElementId, new: ElementId, renamed: bool) {
        self.elements.push(Pair { old, new, swapped: false, renamed });
    }

    /// Elements of one kind between the same nodes, and at first of the same value, that have another name.
    fn match_by_wiring(&mut self, old: &Circuit, new: &Circuit, same_value: bool) {
        let mut free: BTreeMap<(u8, Vec<NodeId>, String), VecDeque<ElementId>> = BTreeMap::new();
        let value = |circuit: &Circuit, id| if same_value { value(circuit, id) } else { String::new() };
        for &id in &self.added {
            let nodes = ends(new, id, |pin| Some(new.node(id, pin))).unwrap_or_default();
            free.entry((new.element(id).letter, nodes, value(new, id))).or_default().push_back(id);
        }
        let (mut left, mut taken) = (Vec::new(), BTreeSet::new());
        for id in std::mem::take(&mut self.gone) {
            let found = ends(old, id, |pin| self.nodes.get(old.node(id, pin)))
                .filter(|nodes| !nodes.is_empty())
                .map(|nodes| (old.element(id).letter, nodes, value(old, id)))
                .and_then(|key| free.get_mut(&key)?.pop_front());
            match found {
                Some(other) => {
                    taken.insert(other);
                    self.push(id, other, true);
                }
                None => left.push(id),
            }
        }
        self.gone = left;
        self.added.retain(|id| !taken.contains(id));
    }
}

/// Parts that work both ways.
pub(super) fn is_symmetric(circuit: &Circuit, id: ElementId) -> bool {
    matches!(circuit.element(id).letter, b'R' | b'C' | b'L')
}

/// The nodes of an element, in order unless it works both ways; `None` where one has no counterpart.
fn ends(circuit: &Circuit, id: ElementId, node: impl Fn(usize) -> Option<NodeId>) -> Option<Vec<NodeId>> {
    let mut nodes: Vec<NodeId> = (0..circuit.pins(id).len()).map(node).collect::<Option<_>>()?;
    if is_symmetric(circuit, id) {
        nodes.sort();
    }
    Some(nodes)
}

fn is_swapped(old: &Circuit, new: &Circuit, nodes: &Nodes, pair: &Pair) -> bool {
    let (before, after) = (old.pins(pair.old), new.pins(pair.new));
    let ([a, b], [c, d]) = (before, after) else { return false };
    is_symmetric(old, pair.old)
        && c.node != d.node
        && nodes.get(a.node) == Some(d.node)
        && nodes.get(b.node) == Some(c.node)
}

/// What an element is worth, in words that are only compared.
fn value(circuit: &Circuit, id: ElementId) -> String {
    match &circuit.element(id).behaviour {
        Behaviour::Resistor(ohms) => ohms.number.to_string(),
        Behaviour::Capacitor { farads, .. } => farads.number.to_string(),
        Behaviour::Inductor { henries, .. } => henries.number.to_string(),
        Behaviour::VoltageSource(source) | Behaviour::CurrentSource(source) => {
            format!("{:?} {:?}", source.dc.map(|v| v.number), source.shape)
        }
        Behaviour::Diode { model: Some(model), area } => {
            format!("{} {area}", circuit.text(circuit.model(*model).name).to_lowercase())
        }
        _ => String::new(),
    }
}
