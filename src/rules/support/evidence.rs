//! What rules look at, and the words and places they share.

use super::super::both_ends_on_one_node;
use super::loose::{self, LooseEnd};
use super::ratings::{self, Limit};
use super::rule::Rule;
use super::standing::{Standing, Timed, timed};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId, ScopeId};
use crate::config::Thresholds;
use crate::finding::{Finding, Severity};
use crate::operating::Operating;
use crate::swing::Swing;
use crate::text::{Sources, Span};
use crate::topology::{Wiring, coupled_coils};
use rustc_hash::{FxHashMap, FxHashSet};
use std::cell::OnceCell;
use std::collections::BTreeMap;

/// Elements whose nodes one finding names at most.
const MOST_NAMED: usize = 40;

/// What rules judge.
pub struct Evidence<'a> {
    /// The text the circuit was read from.
    pub sources: &'a Sources,
    /// The circuit.
    pub circuit: &'a Circuit,
    /// Its wiring.
    pub wiring: &'a Wiring,
    /// Where remarks begin.
    pub thresholds: Thresholds,
    loose: OnceCell<Vec<LooseEnd>>,
    loose_by_scope: OnceCell<FxHashMap<ScopeId, Vec<LooseEnd>>>,
    shorted: OnceCell<FxHashMap<ScopeId, usize>>,
    coupled: OnceCell<FxHashSet<ElementId>>,
    standing: OnceCell<Standing>,
    ratings: OnceCell<BTreeMap<ElementId, Vec<Limit<'a>>>>,
    /// What the time pass has seen of each diode.
    timed: FxHashMap<ElementId, Timed>,
    told: Vec<Finding>,
    /// Everything that a warning or error among those names, and everything that any of them does.
    named: FxHashSet<String>,
    mentioned: FxHashSet<String>,
}

impl<'a> Evidence<'a> {
    /// Of one circuit.
    pub fn new(sources: &'a Sources, circuit: &'a Circuit, wiring: &'a Wiring) -> Self {
        Evidence {
            sources,
            circuit,
            wiring,
            thresholds: Thresholds::default(),
            loose: OnceCell::new(),
            loose_by_scope: OnceCell::new(),
            shorted: OnceCell::new(),
            coupled: OnceCell::new(),
            standing: OnceCell::new(),
            ratings: OnceCell::new(),
            timed: FxHashMap::default(),
            told: Vec::new(),
            named: FxHashSet::default(),
            mentioned: FxHashSet::default(),
        }
    }

    /// With thresholds of the user's own.
    #[must_use]
    pub fn with_thresholds(mut self, thresholds: Thresholds) -> Self {
        self.thresholds = thresholds;
        self
    }

    /// Nodes with one connection that are very likely meant to have more; found once.
    pub(in crate::rules) fn loose_ends(&self) -> &[LooseEnd] {
        self.loose.get_or_init(|| loose::find(self))
    }

    /// What the rules on the wiring have found, for the rules on states: one cause is told once.
    pub(in crate::rules) fn told(&self) -> &[Finding] {
        &self.told
    }

    /// Some of those findings names this.
    pub(in crate::rules) fn mentions(&self, name: &str) -> bool {
        self.mentioned.contains(name)
    }

    /// A warning or error that was found already names the element or one of its nodes that is no rail.
    pub(in crate::rules) fn is_told_near(&self, id: ElementId) -> bool {
        let near = |node: NodeId| node != NodeId::GROUND && !self.wiring.rails.is_rail(node);
        let mut nodes = self.circuit.pins(id).iter().map(|p| p.node).filter(|&n| near(n));
        self.named.contains(&self.name(id)) || nodes.any(|n| self.named.contains(&self.node(n)))
    }

    /// Keeps what the rules on the wiring have found, and all facts that they looked up.
    pub(super) fn keep_told(&mut self, told: Vec<Finding>) {
        let serious = told.iter().filter(|f| f.severity > Severity::Note);
        self.named = serious.flat_map(|f| &f.subjects).cloned().collect();
        self.mentioned = told.iter().flat_map(|f| &f.subjects).cloned().collect();
        self.told = told;
    }

    /// Keeps what the time pass has seen, for diodes that no instant can judge.
    pub(super) fn keep_time(&mut self, swing: &Swing) {
        self.timed = timed(swing);
    }

    /// What the time pass has seen of a diode.
    pub(super) fn timed(&self, id: ElementId) -> Option<Timed> {
        self.timed.get(&id).copied()
    }

    /// A coupling names this coil.
    pub(in crate::rules) fn is_coupled(&self, id: ElementId) -> bool {
        self.coupled.get_or_init(|| coupled_coils(self.circuit)).contains(&id)
    }

    /// What the states say about diodes and rails over all conditions; read once.
    pub(in crate::rules) fn standing(&self, operating: &Operating) -> &Standing {
        self.standing.get_or_init(|| Standing::of(self, operating))
    }

    /// What `rating` notes allow each element; read once.
    pub(in crate::rules) fn ratings(&self) -> &BTreeMap<ElementId, Vec<Limit<'a>>> {
        self.ratings.get_or_init(|| ratings::ratings(self.circuit))
    }

    /// The names of elements' nodes, each once, ground and those that are named already left out: a finding about
    /// elements is found under their nodes too.
    pub(in crate::rules) fn name_nodes(&self, finding: &mut Finding, elements: &[ElementId]) {
        for &id in elements.iter().take(MOST_NAMED) {
            for pin in self.circuit.pins(id) {
                let name = self.node(pin.node);
                if pin.node != NodeId::GROUND && !finding.subjects.contains(&name) {
                    finding.subjects.push(name);
                }
            }
        }
    }

    /// The loose ends of the elements of one instance, in order.
    pub(in crate::rules) fn loose_ends_in(&self, scope: ScopeId) -> &[LooseEnd] {
        let by_scope = self.loose_by_scope.get_or_init(|| {
            let mut by_scope: FxHashMap<ScopeId, Vec<LooseEnd>> = FxHashMap::default();
            for end in self.loose_ends() {
                let scope = self.circuit.element(end.touch.element).scope;
                by_scope.entry(scope).or_default().push(*end);
            }
            by_scope
        });
        by_scope.get(&scope).map_or(&[], Vec::as_slice)
    }

    /// How many elements of one instance have both ends on one node.
    pub(in crate::rules) fn shorted_in(&self, scope: ScopeId) -> usize {
        let counts = self.shorted.get_or_init(|| {
            let mut counts = FxHashMap::default();
            for (id, element) in self.circuit.elements() {
                if both_ends_on_one_node::is_shorted(self, id) {
                    *counts.entry(element.scope).or_insert(0) += 1;
                }
            }
            counts
        });
        counts.get(&scope).copied().unwrap_or(0)
    }

    /// Nothing in the circuit touches ground. Two supplies feed what lies between them without it; one alone does not.
    pub(in crate::rules) fn is_groundless(&self) -> bool {
        self.wiring.touching.at(NodeId::GROUND).is_empty() && self.wiring.noted.supplied.len() < 2
    }

    /// A finding of `rule` about an element: marks its statement, names it, and tells the way to its instance.
    pub fn about(&self, rule: &Rule, element: ElementId, message: impl Into<String>) -> Finding {
        let place = self.circuit.element(element);
        self.at(rule, place.scope, place.statement, message).about(self.circuit.element_name(element))
    }

    /// A finding of `rule` at a place inside an instance.
    pub fn at(&self, rule: &Rule, scope: ScopeId, span: Span, message: impl Into<String>) -> Finding {
        let mut finding = Finding::new(rule.name, rule.severity, span, message);
        finding.trail = self.circuit.trail(scope, span);
        finding
    }

    /// Full name of an element.
    pub fn name(&self, element: ElementId) -> String {
        self.circuit.element_name(element)
    }

    /// The name of a diode's model.
    pub(in crate::rules) fn model_name(&self, element: ElementId) -> Option<&str> {
        match self.circuit.element(element).behaviour {
            Behaviour::Diode { model: Some(model), .. } => {
                Some(self.circuit.text(self.circuit.model(model).name))
            }
            _ => None,
        }
    }

    /// Full name of a node.
    pub fn node(&self, node: NodeId) -> String {
        self.circuit.node_name(node)
    }

    /// The element's statement.
    pub fn statement(&self, element: ElementId) -> Span {
        self.circuit.element(element).statement
    }
}
