//! Nodes whose voltage the model leaves open.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, interval};
use crate::operating::{Case, Interval, Operating};
use crate::topology::{Link, links};
use petgraph::unionfind::UnionFind;
use rustc_hash::FxHashSet;
use std::collections::{BTreeMap, BTreeSet};

pub const RULE: Rule = Rule {
    name: "open-potential",
    group: Group::States,
    severity: Severity::Note,
    also: None,
    summary: "a node's voltage is left open, since only blocking diodes and current sources lead to it",
    why: "No current flows there whatever the voltage is, within the limits that keep the diodes blocking. \
          Leakage decides in the real circuit; the table prints the interval.",
    remedy: "Where the voltage matters, hold the node by a resistance.",
    source: Some(
        "Sets of nodes that only open branches and current sources leave have no determined \
                  potential: Chua, Desoer & Kuh, Linear and Nonlinear Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: input clamp with nothing driving it\n\
              VCC vcc 0 3.3\n\
              D1 in vcc DSW\n\
              D2 0 in DSW\n\
              C1 in 0 1n\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: input clamp with a pull-down\n\
              VCC vcc 0 3.3\n\
              D1 in vcc DSW\n\
              D2 0 in DSW\n\
              C1 in 0 1n\n\
              R1 in 0 100k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    // what is open in one condition only is a pair of diodes that happen to block there
    let (Some(first), false) = (operating.cases.first(), evidence.is_groundless()) else { return Vec::new() };
    let mut open = open_nodes(first);
    for case in &operating.cases {
        let here = open_nodes(case);
        open.retain(|node, _| here.contains_key(node));
    }
    let islands = islands(evidence, first, &open);
    let is_judged = |i: &&Island| !i.leads.iter().any(|id| operating.left_to_time.binary_search(id).is_ok());
    islands.iter().filter(is_judged).filter_map(|island| judge(evidence, island)).collect()
}

fn open_nodes(case: &Case) -> BTreeMap<NodeId, Interval> {
    let nodes = case.solutions.first().into_iter().flat_map(|s| &s.nodes);
    nodes.filter_map(|n| Some((n.node, n.voltage.interval()?))).collect()
}

/// Nodes whose potentials are open together.
struct Island {
    nodes: Vec<NodeId>,
    /// Where the first of them may lie.
    interval: Interval,
    /// Diodes and current sources that lead out, in order.
    leads: Vec<ElementId>,
}

/// The open potentials to which diodes or current sources lead. What only capacitors lead to is
/// a matter of the wiring.
fn islands(evidence: &Evidence<'_>, case: &Case, open: &BTreeMap<NodeId, Interval>) -> Vec<Island> {
    let (Some(solution), false) = (case.solutions.first(), open.is_empty()) else { return Vec::new() };
    let circuit = evidence.circuit;
    let conducting: FxHashSet<ElementId> =
        solution.diodes.iter().filter(|d| d.state != State::Blocking).map(|d| d.element).collect();
    let joins = |id: ElementId| match circuit.element(id).behaviour {
        Behaviour::Diode { .. } => conducting.contains(&id),
        _ => links(circuit, id).any(|(_, _, link)| link == Link::Direct),
    };
    let mut sets = UnionFind::<u32>::new(circuit.nodes.len());
    for (id, _) in circuit.elements() {
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        if open.contains_key(&a) && open.contains_key(&b) && joins(id) {
            sets.union(a.0, b.0);
        }
    }
    let mut groups: BTreeMap<u32, Vec<NodeId>> = BTreeMap::new();
    for node in open.keys() {
        groups.entry(sets.find(node.0)).or_default().push(*node);
    }
    let described = groups.into_values().filter_map(|nodes| {
        let interval = *open.get(nodes.first()?)?;
        let touching = nodes.iter().flat_map(|&n| evidence.wiring.touching.at(n)).map(|t| t.element);
        let leads: BTreeSet<ElementId> = touching
            .filter(|&id| match circuit.element(id).behaviour {
                Behaviour::Diode { .. } => !conducting.contains(&id),
                Behaviour::CurrentSource(_) => true,
                _ => false,
            })
            .collect();
        Some(Island { nodes, interval, leads: leads.into_iter().collect() })
    });
    let mut islands: Vec<Island> = described.filter(|i| !i.leads.is_empty()).collect();
    islands.sort_by(|a, b| a.nodes.cmp(&b.nodes));
    islands
}

fn judge(evidence: &Evidence<'_>, island: &Island) -> Option<Finding> {
    let names: Vec<String> = island.nodes.iter().map(|&n| format!("`{}`", evidence.node(n))).collect();
    let leads: Vec<String> = island.leads.iter().map(|&id| evidence.name(id)).collect();
    let message = format!(
        "the voltage of {} is open ({}): only {} {} there, and no current flows",
        list(&names),
        interval(island.interval.low, island.interval.high, "V"),
        list(&leads),
        if leads.len() == 1 { "leads" } else { "lead" },
    );
    let (&first, others) = island.leads.split_first()?;
    if is_told_node(evidence, island) {
        return None;
    }
    let mut finding = evidence.about(&RULE, first, message).label("carries nothing");
    for &id in others.iter().take(8) {
        finding = finding.also(evidence.statement(id), "nor does this");
    }
    finding.subjects.extend(leads.into_iter().skip(1));
    finding.subjects.extend(names.iter().map(|n| n.trim_matches('`').to_owned()));
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// A finding of the wiring names one of the nodes or one of the diodes that lead there.
fn is_told_node(evidence: &Evidence<'_>, island: &Island) -> bool {
    let nodes = island.nodes.iter().map(|&n| evidence.node(n));
    let leads = island.leads.iter().map(|&id| evidence.name(id));
    let names: Vec<String> = nodes.chain(leads).collect();
    evidence
        .told()
        .iter()
        .any(|f| f.severity > Severity::Note && names.iter().any(|n| f.subjects.contains(n)))
}
