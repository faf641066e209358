//! Diodes through which a current can flow once, but not last: what they charge has no way to discharge.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId, NoteKind};
use crate::finding::{Finding, Severity};
use crate::topology::{Barred, is_opaque, is_sensing};
use petgraph::unionfind::UnionFind;
use rustc_hash::{FxHashMap, FxHashSet};
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "no-lasting-current",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode charges a capacitor that nothing discharges, so it carries no lasting current",
    why: "A capacitor carries no mean current, so what flows in through a diode must flow out some other way than \
          through capacitors. Here every other way is a diode that points against it: the capacitor charges once and \
          stays so, and what it is to feed gets nothing more.",
    remedy: "Put in the load or the resistor that discharges the capacitor, or turn the diode that points the wrong \
             way round. Where the charge is meant to stay, say that its voltage is read: `*@ watch NODE`.",
    source: Some(
        "Mean currents of a periodic state obey Kirchhoff's law with all capacitors open, so a diode in a directed cut \
         of what is left has none: G. J. Minty, Monotone networks, Proc. R. Soc. Lond. A 257 (1960) 194-212",
    ),
    failing: "tide gauge buoy: store of the sounder, its load forgotten\n\
              VBUS bus 0 12\n\
              R1 bus pre 100\n\
              D1 pre store DSW\n\
              C1 store 0 4700u\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: store of the sounder\n\
              VBUS bus 0 12\n\
              R1 bus pre 100\n\
              D1 pre store DSW\n\
              C1 store 0 4700u\n\
              R2 store 0 1k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let never: FxHashSet<ElementId> = evidence.wiring.one_way.barred.iter().map(|b| b.diode).collect();
    let clusters = clusters(evidence);
    let ours = clusters.iter().filter(|c| !c.iter().any(|b| never.contains(&b.diode)));
    ours.filter(|c| !is_read(evidence, c) && !is_loose(evidence, c)).map(|c| judge(evidence, c)).collect()
}

/// Barred diodes that meet in a set of nodes other than that of ground.
fn clusters(evidence: &Evidence<'_>) -> Vec<Vec<Barred>> {
    let facts = &evidence.wiring.steady;
    let circuit = evidence.circuit;
    let barred: Vec<Barred> = facts
        .barred
        .iter()
        .filter(|b| circuit.node(b.diode, 0) != circuit.node(b.diode, 1))
        .copied()
        .collect();
    let mut sets = UnionFind::<u32>::new(barred.len());
    let mut first_at: FxHashMap<u32, u32> = FxHashMap::default();
    for (n, b) in barred.iter().enumerate() {
        for component in [b.components.0, b.components.1].into_iter().filter(|&c| c != facts.ground) {
            sets.union(*first_at.entry(component).or_insert(n as u32), n as u32);
        }
    }
    let mut clusters: BTreeMap<u32, Vec<Barred>> = BTreeMap::new();
    for (n, b) in barred.iter().enumerate() {
        clusters.entry(sets.find(n as u32)).or_default().push(*b);
    }
    clusters.into_values().collect()
}

/// The nodes that the diodes reach and that no lasting current leaves, in order.
fn dead_ends(evidence: &Evidence<'_>, cluster: &[Barred]) -> Vec<NodeId> {
    let facts = &evidence.wiring.steady;
    let mut nodes = Vec::new();
    for b in cluster {
        for (pin, component) in [(0, b.components.0), (1, b.components.1)] {
            if component != facts.ground {
                nodes.push(evidence.circuit.node(b.diode, pin));
            }
        }
    }
    nodes.sort();
    nodes.dedup();
    nodes
}

/// Somebody reads the voltage that is held: a note, an input that listens, a gate, an unknown part; or it is the shifted
/// side of a single coupling capacitor with one diode, a restorer whose load stands elsewhere.
fn is_read(evidence: &Evidence<'_>, cluster: &[Barred]) -> bool {
    let circuit = evidence.circuit;
    let ends = dead_ends(evidence, cluster);
    // where several diodes feed a node, it is a supply
    let is_watched = |node: NodeId| {
        let is_named = |s| circuit.text(s).eq_ignore_ascii_case(&evidence.node(node));
        let watches = circuit.notes.iter().filter(|n| matches!(n.kind, NoteKind::Watch { .. }));
        cluster.len() == 1 && watches.into_iter().any(|n| is_named(n.subject))
    };
    let listens = |node: NodeId| {
        is_watched(node)
            || circuit.initial.iter().any(|&(n, _)| n == node)
            || evidence.wiring.touching.at(node).iter().any(|t| {
                let pin = t.pin as usize;
                let behaviour = &circuit.element(t.element).behaviour;
                is_sensing(circuit, t.element, pin)
                    || is_opaque(circuit, t.element)
                    || matches!(behaviour, Behaviour::Transistor { .. })
                    || matches!(behaviour, Behaviour::Capacitor { initial: Some(_), .. })
            })
    };
    ends.iter().any(|&n| listens(n)) || is_restorer(evidence, cluster, &ends)
}

fn is_restorer(evidence: &Evidence<'_>, cluster: &[Barred], ends: &[NodeId]) -> bool {
    let circuit = evidence.circuit;
    let ([_], [node]) = (cluster, ends) else { return false };
    let mut capacitors = evidence
        .wiring
        .touching
        .at(*node)
        .iter()
        .filter(|t| matches!(circuit.element(t.element).behaviour, Behaviour::Capacitor { .. }));
    let (Some(one), None) = (capacitors.next(), capacitors.next()) else { return false };
    let far = circuit.node(one.element, 1 - one.pin.min(1) as usize);
    let rails = &evidence.wiring.rails;
    let is_moving = rails.source(far).is_some_and(
        |id| matches!(&circuit.element(id).behaviour, Behaviour::VoltageSource(s) if s.shape.is_some()),
    );
    far != NodeId::GROUND && (is_moving || !rails.is_rail(far))
}

fn is_loose(evidence: &Evidence<'_>, cluster: &[Barred]) -> bool {
    let slips = evidence.loose_ends().iter().flat_map(|end| [Some(end.node), end.meant]).flatten();
    let loose: FxHashSet<NodeId> = slips.filter(|&n| n != NodeId::GROUND).collect();
    cluster
        .iter()
        .any(|b| b.loose_end || evidence.circuit.pins(b.diode).iter().any(|p| loose.contains(&p.node)))
}

fn judge(evidence: &Evidence<'_>, cluster: &[Barred]) -> Finding {
    let first = cluster[0].diode;
    let names: Vec<String> = cluster.iter().map(|b| evidence.name(b.diode)).collect();
    let ends: Vec<String> =
        dead_ends(evidence, cluster).iter().map(|&n| format!("`{}`", evidence.node(n))).collect();
    let (what, verb) = if names.len() == 1 { ("it", "carries") } else { ("they", "carry") };
    let message = format!(
        "{} {verb} no lasting current: nothing but capacitors leads on from {}, which {what} can only charge once",
        list(&names),
        list(&ends)
    );
    let mut finding = evidence.about(&RULE, first, message).label("charges and is done");
    for b in cluster.iter().skip(1).take(6) {
        finding = finding.also(evidence.statement(b.diode), "likewise");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    let diodes: Vec<ElementId> = cluster.iter().map(|b| b.diode).collect();
    evidence.name_nodes(&mut finding, &diodes);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
