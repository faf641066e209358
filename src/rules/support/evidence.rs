//! What rules look at, and the words and places they share.

use super::super::both_ends_on_one_node;
use super::loose::{self, LooseEnd};
use super::rule::Rule;
use crate::circuit::{Circuit, ElementId, NodeId, ScopeId};
use crate::config::Thresholds;
use crate::finding::Finding;
use crate::text::{Sources, Span};
use crate::topology::Wiring;
use rustc_hash::FxHashMap;
use std::cell::OnceCell;

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
    told: Vec<Finding>,
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
            told: Vec::new(),
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

    pub(super) fn with_told(&self, told: Vec<Finding>) -> Evidence<'a> {
        let fresh = Evidence::new(self.sources, self.circuit, self.wiring);
        Evidence { told, ..fresh.with_thresholds(self.thresholds) }
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

    /// Nothing in the circuit touches ground.
    pub(in crate::rules) fn is_groundless(&self) -> bool {
        self.wiring.touching.at(NodeId::GROUND).is_empty() && self.wiring.noted.supplied.is_empty()
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

    /// Full name of a node.
    pub fn node(&self, node: NodeId) -> String {
        self.circuit.node_name(node)
    }

    /// The element's statement.
    pub fn statement(&self, element: ElementId) -> Span {
        self.circuit.element(element).statement
    }
}
