//! A diode that no closed path lets conduct.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::Barred;
use petgraph::unionfind::UnionFind;
use rustc_hash::{FxHashMap, FxHashSet};
use std::cell::LazyCell;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "never-conducts",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "no closed path lets a diode conduct, whatever the values are",
    why: "A current needs a closed path. Every path through this diode ends, or meets another diode that only \
          passes the other way, so it never carries forward current.",
    remedy: "Turn the diode that points the wrong way round, or close the path.",
    source: Some(
        "A branch lies in a directed loop or in a directed cut, never in both: G. J. Minty, Monotone \
                  networks, Proc. R. Soc. Lond. A 257 (1960) 194-212",
    ),
    failing: "tide gauge buoy: isolated sensor supply\n\
              V1 prim 0 SIN(0 12 50)\n\
              R1 prim p 1\n\
              L1 p 0 100m\n\
              L2 s1 s2 100m\n\
              K1 L1 L2 0.98\n\
              RS s1 s2 10k\n\
              D1 s1 raw DRECT\n\
              C1 raw ret 4u7\n\
              RLOAD raw ret 100k\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    passing: "tide gauge buoy: isolated sensor supply\n\
              V1 prim 0 SIN(0 12 50)\n\
              R1 prim p 1\n\
              L1 p 0 100m\n\
              L2 s1 0 100m\n\
              K1 L1 L2 0.98\n\
              RS s1 0 10k\n\
              D1 s1 raw DRECT\n\
              C1 raw 0 4u7\n\
              RLOAD raw 0 100k\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let opposed: FxHashSet<ElementId> =
        super::opposed_in_series::pairs(evidence).into_iter().flat_map(|p| p.diodes).collect();
    let feed_is_cut = LazyCell::new(|| feed_is_cut(evidence));
    let is_told = |cluster: &Vec<Barred>| {
        cluster.iter().any(|b| b.loose_end || opposed.contains(&b.diode)) || *feed_is_cut
    };
    clusters(evidence)
        .iter()
        .filter(|cluster| !is_told(cluster))
        .map(|cluster| judge(evidence, cluster))
        .collect()
}

/// Barred diodes that share a cause: those that meet in a component other than that of ground.
fn clusters(evidence: &Evidence<'_>) -> Vec<Vec<Barred>> {
    let facts = &evidence.wiring.one_way;
    let barred: Vec<Barred> =
        facts.barred.iter().filter(|b| !is_shorted(evidence, b.diode)).copied().collect();
    let mut sets = UnionFind::<u32>::new(barred.len());
    let mut first_at: FxHashMap<u32, u32> = FxHashMap::default();
    for (n, b) in barred.iter().enumerate() {
        for component in [b.components.0, b.components.1] {
            if component != facts.ground {
                sets.union(*first_at.entry(component).or_insert(n as u32), n as u32);
            }
        }
    }
    let mut clusters: BTreeMap<u32, Vec<Barred>> = BTreeMap::new();
    for (n, b) in barred.iter().enumerate() {
        clusters.entry(sets.find(n as u32)).or_default().push(*b);
    }
    let mut clusters: Vec<Vec<Barred>> = clusters.into_values().collect();
    clusters.sort_by_key(|cluster| cluster.first().map(|b| b.diode));
    clusters
}

/// Nodes named of what the cluster leads into or out of.
const MOST_NAMED: usize = 12;

/// The nodes into or out of which no current can close its path, because of this cluster: what misses its feed or its
/// return is among them.
fn cut_off(evidence: &Evidence<'_>, cluster: &[Barred]) -> Vec<NodeId> {
    let facts = &evidence.wiring.one_way;
    let sides = cluster.iter().flat_map(|b| [b.components.0, b.components.1]);
    let sides: FxHashSet<u32> = sides.filter(|&c| c != facts.ground).collect();
    let is_inside =
        |node: &NodeId| facts.component.get(facts.two_way.of(*node)).is_some_and(|c| sides.contains(c));
    let nodes = (1..evidence.circuit.nodes.len()).map(NodeId::new);
    let inside: Vec<NodeId> = nodes.filter(is_inside).take(MOST_NAMED + 1).collect();
    if inside.len() > MOST_NAMED { Vec::new() } else { inside }
}

fn is_shorted(evidence: &Evidence<'_>, id: ElementId) -> bool {
    evidence.circuit.node(id, 0) == evidence.circuit.node(id, 1)
}

/// A source hangs loose or is shorted, which is told: what it fed has no closed path for that reason.
fn feed_is_cut(evidence: &Evidence<'_>) -> bool {
    let is_source = |id: ElementId| {
        matches!(
            evidence.circuit.element(id).behaviour,
            Behaviour::VoltageSource(_) | Behaviour::CurrentSource(_)
        )
    };
    evidence.loose_ends().iter().any(|end| is_source(end.touch.element))
        || evidence.circuit.elements().any(|(id, _)| is_source(id) && is_shorted(evidence, id))
}

fn judge(evidence: &Evidence<'_>, cluster: &[Barred]) -> Finding {
    let first = cluster[0];
    let names: Vec<String> = cluster.iter().map(|b| evidence.name(b.diode)).collect();
    let (anode, cathode) = (evidence.circuit.node(first.diode, 0), evidence.circuit.node(first.diode, 1));
    let reason = match cluster {
        [one] if one.dead_end => format!(
            "it is the only link from `{}` to `{}`, so no current can come back",
            evidence.node(anode),
            evidence.node(cathode)
        ),
        [_] => format!(
            "every way back from `{}` to `{}` meets a diode that points against it",
            evidence.node(cathode),
            evidence.node(anode)
        ),
        _ if cluster.iter().all(|b| b.dead_end) => {
            "they lead to a dead end from which no current comes back".into()
        }
        _ => {
            "no closed path leads through them, since what they feed has no way back to where they come from"
                .into()
        }
    };
    let message = format!("{} can never conduct: {reason}", list(&names));
    let mut finding = evidence.about(&RULE, first.diode, message).label("no closed path passes this way");
    for other in cluster.iter().skip(1).take(8) {
        finding = finding.also(evidence.statement(other.diode), "nor this way");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    let diodes: Vec<ElementId> = cluster.iter().map(|b| b.diode).collect();
    evidence.name_nodes(&mut finding, &diodes);
    for node in cut_off(evidence, cluster) {
        let name = evidence.node(node);
        if !finding.subjects.contains(&name) {
            finding.subjects.push(name);
        }
    }
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
