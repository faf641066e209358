//! Four diodes in a ring of which one points so that three in series lie across the fourth.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, ModelId, NodeId};
use crate::finding::{Finding, Severity};
use rustc_hash::FxHashMap;
use std::collections::BTreeSet;

pub const RULE: Rule = Rule {
    name: "uneven-ring",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "in a ring of four diodes one lies the wrong way round: three in series lie across the fourth",
    why: "In a bridge two ways of two diodes each lead from one corner to the opposite one. Here one diode alone leads \
          where the other three lead in series, and its drop keeps those three from ever conducting together.",
    remedy: "Turn the diode round that makes two ways of two out of it.",
    source: None,
    failing: "tide gauge buoy: sampling gate\n\
              VUP up 0 6\n\
              RUP up top 2k\n\
              VDN dn 0 -6\n\
              RDN dn bot 2k\n\
              VSIG sig 0 0.3\n\
              RSIG sig gin 50\n\
              D1 gin top DSW\n\
              D2 top gout DSW\n\
              D3 gin bot DSW\n\
              D4 gout bot DSW\n\
              RHOLD gout 0 100k\n\
              .model DSW D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: modem that may be plugged in either way round\n\
              VLINE la lb 24\n\
              RWIRE la ta 1.5\n\
              D1 ta plus DRECT\n\
              D2 lb plus DRECT\n\
              D3 0 ta DRECT\n\
              D4 0 lb DRECT\n\
              RMODEM plus 0 330\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    check: Check::Wiring(check),
};

/// Lines with more diodes than this are no corners of a ring.
const MOST: usize = 8;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut by_model: FxHashMap<ModelId, Vec<ElementId>> = FxHashMap::default();
    for (id, element) in circuit.elements() {
        if let Behaviour::Diode { model: Some(model), .. } = element.behaviour
            && circuit.node(id, 0) != circuit.node(id, 1)
        {
            by_model.entry(model).or_default().push(id);
        }
    }
    let mut rings: BTreeSet<[ElementId; 4]> = BTreeSet::new();
    for diodes in by_model.values().filter(|d| d.len() > 3) {
        rings.extend(uneven(evidence, diodes));
    }
    // one diode that is turned spoils every ring that it lies in
    let mut told: BTreeSet<ElementId> = BTreeSet::new();
    let mut findings = Vec::new();
    for ring in rings {
        if ring.iter().filter(|id| told.contains(id)).count() < 2 {
            findings.push(judge(evidence, ring));
        }
        told.extend(ring);
    }
    findings
}

/// Rings in which three diodes lead in series from where the fourth begins to where it ends.
fn uneven(evidence: &Evidence<'_>, diodes: &[ElementId]) -> Vec<[ElementId; 4]> {
    let circuit = evidence.circuit;
    let mut from: FxHashMap<NodeId, Vec<(NodeId, ElementId)>> = FxHashMap::default();
    for &id in diodes {
        from.entry(circuit.node(id, 0)).or_default().push((circuit.node(id, 1), id));
    }
    let onward =
        |node: NodeId| from.get(&node).map_or(&[][..], |list| if list.len() > MOST { &[] } else { list });
    let mut rings = Vec::new();
    for &single in diodes {
        let (start, end) = (circuit.node(single, 0), circuit.node(single, 1));
        for &(b, first) in onward(start) {
            for &(c, second) in onward(b) {
                let closes = onward(c).iter().find(|(d, _)| *d == end);
                let corners = [start, b, c, end];
                let apart = corners.iter().collect::<BTreeSet<_>>().len() == 4;
                if let (Some(&(_, third)), true) = (closes, apart) {
                    let mut ring = [single, first, second, third];
                    ring.sort();
                    rings.push(ring);
                }
            }
        }
    }
    rings
}

fn judge(evidence: &Evidence<'_>, ring: [ElementId; 4]) -> Finding {
    let names = ring.map(|id| evidence.name(id));
    let message = format!("{} form a ring in which three in series lie across the fourth", list(&names));
    let mut finding = evidence.about(&RULE, ring[0], message).label("in the ring");
    for &id in &ring[1..] {
        finding = finding.also(evidence.statement(id), "in the ring");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    evidence.name_nodes(&mut finding, &ring);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
