//! Elements that come, go, get another name, or are connected otherwise.

use super::matching::{Pair, Pairs};
use super::outcome::WiringChange;
use crate::circuit::{Circuit, ElementId, NodeId, ScopeId};
use crate::finding::{self, list};
use crate::text::Span;
use std::collections::{BTreeMap, BTreeSet};

/// All of them: what changed, what came, what went.
pub(super) fn between(old: &Circuit, new: &Circuit, pairs: &Pairs) -> Vec<WiringChange> {
    let mut told = Told::default();
    for pair in &pairs.elements {
        if let Some(what) = changed(old, new, pairs, pair) {
            told.tell(new, pair.new, what);
        }
    }
    let added = whole_instances(new, old, &pairs.added);
    for &id in &pairs.added {
        match added.of(new, id) {
            Some((scope, count)) => told.tell_instance(new, scope, "is new", count),
            None => told.tell(new, id, format!("is new; it joins {}", ends(new, id))),
        }
    }
    let gone = whole_instances(old, new, &pairs.gone);
    for &id in &pairs.gone {
        match gone.of(old, id) {
            Some((scope, count)) => told.tell_instance(old, scope, "is gone", count),
            None => told.tell(old, id, format!("is gone; it joined {}", ends(old, id))),
        }
    }
    told.finish()
}

/// Instances that one revision has and the other does not, the outermost ones, with how many of `elements` they hold.
struct Instances(BTreeMap<ScopeId, (ScopeId, usize)>);

fn whole_instances(circuit: &Circuit, other: &Circuit, elements: &[ElementId]) -> Instances {
    let known: BTreeSet<String> =
        (0..other.scopes.len()).map(|n| other.scope_name(ScopeId::new(n)).to_lowercase()).collect();
    let mut outermost = BTreeMap::new();
    let mut counts: BTreeMap<ScopeId, usize> = BTreeMap::new();
    for &id in elements {
        let scope = circuit.element(id).scope;
        let missing = scopes_outward(circuit, scope)
            .filter(|&s| s != ScopeId::ROOT && !known.contains(&circuit.scope_name(s).to_lowercase()))
            .last();
        if let Some(found) = missing {
            outermost.insert(scope, found);
            *counts.entry(found).or_insert(0) += 1;
        }
    }
    let count = |found: ScopeId| counts.get(&found).copied().unwrap_or(0);
    Instances(outermost.into_iter().map(|(scope, found)| (scope, (found, count(found)))).collect())
}

impl Instances {
    fn of(&self, circuit: &Circuit, id: ElementId) -> Option<(ScopeId, usize)> {
        self.0.get(&circuit.element(id).scope).copied()
    }
}

fn scopes_outward(circuit: &Circuit, scope: ScopeId) -> impl Iterator<Item = ScopeId> + '_ {
    std::iter::successors(Some(scope), |s| circuit.scopes.get(s.index()).and_then(|s| s.parent))
}

/// `in to out`
fn ends(circuit: &Circuit, id: ElementId) -> String {
    let names: Vec<String> = circuit.pins(id).iter().map(|p| circuit.node_name(p.node)).collect();
    match names.as_slice() {
        [a, b] => format!("{a} to {b}"),
        [] => "no nodes".into(),
        more => list(more, 6),
    }
}

/// What is different about a pair, as the rest of a sentence.
fn changed(old: &Circuit, new: &Circuit, pairs: &Pairs, pair: &Pair) -> Option<String> {
    let was = |pin: usize| pairs.nodes.get(old.node(pair.old, pin));
    let (before, after) = (old.pins(pair.old), new.pins(pair.new));
    let mut parts = Vec::new();
    if pair.renamed {
        parts.push(format!("was {}", old.element_name(pair.old)));
    }
    if before.len() != after.len() {
        parts.push(format!("now joins {}; it joined {}", ends(new, pair.new), ends(old, pair.old)));
    } else if !pair.swapped {
        let moved: Vec<usize> =
            (0..after.len()).filter(|&pin| was(pin) != Some(new.node(pair.new, pin))).collect();
        let is_turned = after.len() == 2
            && moved.len() == 2
            && was(0) == Some(new.node(pair.new, 1))
            && was(1) == Some(new.node(pair.new, 0));
        if is_turned {
            parts.push(format!("is turned round; it now leads {}", direction(new, pair.new)));
        } else {
            let ends = moved.iter().map(|&pin| moved_end(old, new, pair, pin));
            parts.extend(ends);
        }
    }
    (!parts.is_empty()).then(|| parts.join("; "))
}

/// `from in to out`
fn direction(circuit: &Circuit, id: ElementId) -> String {
    let name = |pin| circuit.node_name(circuit.node(id, pin));
    format!("from {} to {}", name(0), name(1))
}

/// `its cathode moved from out to bus`
fn moved_end(old: &Circuit, new: &Circuit, pair: &Pair, pin: usize) -> String {
    let end = match (new.element(pair.new).letter, pin) {
        (b'D', 0) => "its anode".to_owned(),
        (b'D', 1) => "its cathode".to_owned(),
        (_, 0) => "its first end".to_owned(),
        (_, 1) => "its second end".to_owned(),
        (_, pin) => format!("its pin {}", pin + 1),
    };
    let name = |circuit: &Circuit, node: NodeId| circuit.node_name(node);
    format!(
        "{end} moved from {} to {}",
        name(old, old.node(pair.old, pin)),
        name(new, new.node(pair.new, pin))
    )
}

/// Tells a change inside a subcircuit once, however many instances repeat it.
#[derive(Default)]
struct Told {
    changes: Vec<(WiringChange, usize)>,
    known: BTreeMap<(Span, bool, usize), usize>,
    instances: BTreeSet<(String, String)>,
}

impl Told {
    /// Tells of an instance once, at the first of its elements.
    fn tell_instance(&mut self, circuit: &Circuit, scope: ScopeId, what: &str, count: usize) {
        let element = circuit.scope_name(scope);
        if self.instances.insert((what.to_owned(), element.clone())) {
            let subcircuit = circuit.text(circuit.scopes[scope.index()].subcircuit);
            let what = format!("{what}, an instance of {subcircuit} ({})", finding::count(count, "element"));
            self.changes.push((WiringChange { element, what }, 1));
        }
    }

    fn tell(&mut self, circuit: &Circuit, id: ElementId, what: String) {
        let element = circuit.element(id);
        let is_inside = element.scope != ScopeId::ROOT;
        let change = WiringChange { element: circuit.element_name(id), what };
        // alike: the same statement, and words of the same shape
        let key = (element.statement, change.what.starts_with("is gone"), change.what.matches(';').count());
        match self.known.get(&key).filter(|_| is_inside).and_then(|&at| self.changes.get_mut(at)) {
            Some((_, count)) => *count += 1,
            None => {
                self.known.insert(key, self.changes.len());
                self.changes.push((change, 1));
            }
        }
    }

    fn finish(self) -> Vec<WiringChange> {
        let counted = |(mut change, count): (WiringChange, usize)| {
            if count > 1 {
                change.what.push_str(&format!(" (the same in {count} instances)"));
            }
            change
        };
        self.changes.into_iter().map(counted).collect()
    }
}
