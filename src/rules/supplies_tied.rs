//! Two supplies of different voltage joined by nothing but leads.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::Touch;

pub const RULE: Rule = Rule {
    name: "supplies-tied",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "two supplies of clearly different voltage are joined by a few ohms, with nothing that keeps them apart",
    why: "The higher one drives its current straight into the lower one, and only their own resistance limits it. \
          Supplies meet through diodes, or through a resistance that is meant.",
    remedy: "Put the diode in that is missing, or tell the two nodes apart that have become one.",
    source: None,
    failing: "tide gauge buoy: panel and battery, the diodes left out\n\
              VPANEL sun 0 18.4\n\
              RPANEL sun bus 2.2\n\
              VBATT cell 0 12.6\n\
              RBATT cell bus 80m\n\
              RLOAD bus 0 47\n",
    passing: "tide gauge buoy: two batteries of one kind\n\
              VBATT1 cell1 0 12.6\n\
              RBATT1 cell1 bus 80m\n\
              VBATT2 cell2 0 12.5\n\
              RBATT2 cell2 bus 80m\n\
              RLOAD bus 0 47\n",
    check: Check::States(check),
};

/// Up to here a resistance is a lead, a fuse or the inside of a source.
const LEAD: f64 = 5.0;
/// Supplies of one nominal voltage differ by less than this share.
const SAME: f64 = 0.08;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut findings = Vec::new();
    for (id, element) in circuit.elements() {
        let Behaviour::Resistor(ohms) = &element.behaviour else { continue };
        if !(ohms.number > 0.0 && ohms.number <= LEAD) {
            continue;
        }
        let (a, b) = (circuit.node(id, 0), circuit.node(id, 1));
        match (rails.is_rail(a), rails.is_rail(b)) {
            (true, true) => findings.extend(judge(evidence, operating, &[id], a, b)),
            (true, false) => findings.extend(beyond(evidence, operating, id, a, b)),
            (false, true) => findings.extend(beyond(evidence, operating, id, b, a)),
            (false, false) => {}
        }
    }
    findings
}

/// Leads from the node at the far end to other rails; each pair is told from the element that is written first.
fn beyond(
    evidence: &Evidence<'_>,
    operating: &Operating,
    id: ElementId,
    rail: NodeId,
    node: NodeId,
) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let lead = |touch: &Touch| {
        let Behaviour::Resistor(ohms) = &circuit.element(touch.element).behaviour else { return None };
        let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
        let is_lead = ohms.number > 0.0 && ohms.number <= LEAD && evidence.wiring.rails.is_rail(far);
        (is_lead && touch.element > id && far != rail).then_some((touch.element, far))
    };
    let leads: Vec<(ElementId, NodeId)> = evidence.wiring.touching.at(node).iter().filter_map(lead).collect();
    leads.iter().filter_map(|&(other, far)| judge(evidence, operating, &[id, other], rail, far)).collect()
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    leads: &[ElementId],
    one: NodeId,
    two: NodeId,
) -> Option<Finding> {
    let standing = evidence.standing(operating);
    let rails = &evidence.wiring.rails;
    let (source, other) = (rails.source(one)?, rails.source(two)?);
    let is_steady = |id: ElementId| matches!(&evidence.circuit.element(id).behaviour, Behaviour::VoltageSource(s) if s.shape.is_none());
    let (a, b) = (standing.rail(one)?, standing.rail(two)?);
    // ammeters and references of 0 V are no supplies
    let least = a.0.abs().min(b.0.abs());
    let apart = (a.0 - b.0).abs();
    if !is_steady(source) || !is_steady(other) || least < 0.5 || apart <= SAME * a.0.abs().max(b.0.abs()) {
        return None;
    }
    let ohms: f64 = leads
        .iter()
        .map(|&id| match &evidence.circuit.element(id).behaviour {
            Behaviour::Resistor(ohms) => ohms.number,
            _ => 0.0,
        })
        .sum();
    let names = leads.iter().map(|&id| evidence.name(id)).collect::<Vec<_>>();
    let message = format!(
        "{} ({}) and {} ({}) are joined by {} alone: {} would flow from one into the other",
        evidence.name(source),
        quantity(a.0, "V"),
        evidence.name(other),
        quantity(b.0, "V"),
        quantity(ohms, "Ω"),
        quantity(apart / ohms, "A")
    );
    let mut finding = evidence.about(&RULE, source, message).label("one of the supplies");
    finding = finding.also(evidence.statement(other), "the other").about(evidence.name(other));
    for &id in leads {
        finding = finding.also(evidence.statement(id), "all that lies between");
    }
    finding.subjects.extend(names);
    evidence.name_nodes(&mut finding, leads);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
