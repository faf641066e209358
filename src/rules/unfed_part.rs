//! Loops in which nothing drives a current.

use super::{Check, Evidence, Group, Rule, count, list};
use crate::circuit::{Behaviour, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::Unfed;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "unfed-part",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "elements form loops that no source drives, so they carry no current",
    why: "A current flows only around a loop that holds a source, and these elements meet the rest of the circuit in \
          one node at most. Usually a source is missing, an element that led here was taken out, or two nodes have \
          become one.",
    remedy: "Put the missing source or connection in, tell the two nodes apart, or take the elements out. A board \
             without sources takes a note for each node that feeds it: `*@ supply NODE VOLTS`.",
    source: Some(
        "The blocks of a graph have independent currents: J. Hopcroft and R. Tarjan, Efficient algorithms for graph \
         manipulation, Comm. ACM 16 (1973) 372-378, with Kirchhoff's current law for the node between two blocks",
    ),
    failing: "tide gauge buoy: status lamp\n\
              VBAT bat 0 12\n\
              R1 bat 0 10k\n\
              R2 vaux lamp 330\n\
              D1 lamp 0 DRED\n\
              R3 vaux 0 4k7\n\
              .model DRED D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: status lamp\n\
              VBAT bat 0 12\n\
              R1 bat 0 10k\n\
              VAUX vaux 0 5\n\
              R2 vaux lamp 330\n\
              D1 lamp 0 DRED\n\
              R3 vaux 0 4k7\n\
              .model DRED D(IS=1e-18 N=2)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() || is_cut_off(evidence) {
        return Vec::new();
    }
    // a slip of the pen is two nodes: the loose end and the one that was meant
    let slips = evidence.loose_ends().iter().flat_map(|end| [Some(end.node), end.meant]).flatten();
    let loose: FxHashSet<NodeId> = slips.filter(|&n| n != NodeId::GROUND).collect();
    let related = &evidence.wiring.related;
    // what floats is told as floating, what hangs on a loose end as that
    // beyond a diode that can never conduct nothing is fed either
    let barred = || evidence.wiring.one_way.barred.iter().filter(|b| b.dead_end).map(|b| b.diode);
    let beyond: FxHashSet<NodeId> = barred()
        .flat_map(|id| evidence.circuit.pins(id))
        .map(|p| p.node)
        .filter(|&n| n != NodeId::GROUND)
        .collect();
    let is_told = |part: &&Unfed| {
        part.nodes.iter().any(|n| beyond.contains(n))
            || part.nodes.iter().any(|n| loose.contains(n))
            || part.nodes.iter().all(|&n| related.of(n) != 0)
    };
    evidence.wiring.unfed.iter().filter(|part| !is_told(part)).map(|part| judge(evidence, part)).collect()
}

/// A source hangs loose or is shorted, which is told: what it fed is unfed for that reason.
fn is_cut_off(evidence: &Evidence<'_>) -> bool {
    let circuit = evidence.circuit;
    let is_source = |id| {
        matches!(circuit.element(id).behaviour, Behaviour::VoltageSource(_) | Behaviour::CurrentSource(_))
    };
    evidence.loose_ends().iter().any(|end| is_source(end.touch.element))
        || circuit.elements().any(|(id, _)| is_source(id) && circuit.node(id, 0) == circuit.node(id, 1))
}

fn judge(evidence: &Evidence<'_>, part: &Unfed) -> Finding {
    let first = part.elements[0];
    let names: Vec<String> = part.elements.iter().map(|&id| evidence.name(id)).collect();
    let nodes: Vec<String> =
        part.nodes.iter().filter(|&&n| n != NodeId::GROUND).map(|&n| evidence.node(n)).collect();
    let place = match nodes.as_slice() {
        [one] => format!("node `{one}`"),
        many => {
            format!("{} around `{}`", count(many.len(), "node"), many.first().map_or("0", String::as_str))
        }
    };
    let message = format!("no source drives {}: they carry no current ({place})", list(&names));
    let mut finding = evidence.about(&RULE, first, message).label("carries nothing");
    for &id in part.elements.iter().skip(1).take(6) {
        finding = finding.also(evidence.statement(id), "nor does this");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    finding.subjects.extend(nodes);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
