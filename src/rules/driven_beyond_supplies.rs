//! A current source that drives a node far beyond all supplies, because what should take its current is not there.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "driven-beyond-supplies",
    group: Group::States,
    severity: Severity::Warning,
    also: None,
    summary: "a current source drives a node to many times the voltage of all supplies",
    why: "A real current source gives up at its supply, long before. Such a voltage means that its current finds only a \
          large resistance: the load, a diode that points the other way, or the direction of the source is wrong.",
    remedy: "Look at what is to take the current, and at the direction of the source: it flows from its first node through \
             the source to the second.",
    source: None,
    failing: "tide gauge buoy: excitation of the thermistor\n\
              VCC vcc 0 3.3\n\
              I1 vcc out 100u\n\
              R1 out 0 10meg\n\
              D1 0 out DREF\n\
              .model DREF D(IS=1f N=1)\n",
    passing: "tide gauge buoy: excitation of the thermistor\n\
              VCC vcc 0 3.3\n\
              I1 vcc out 100u\n\
              R1 out 0 10k\n\
              D1 0 out DREF\n\
              .model DREF D(IS=1f N=1)\n",
    check: Check::States(check),
};

/// So many times the greatest supply is no compliance any more.
const TIMES: f64 = 20.0;
/// Nor is less than this, in volts, worth a word.
const LEAST: f64 = 300.0;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let standing = evidence.standing(operating);
    let greatest = standing.greatest_rail();
    if greatest == 0.0 {
        return Vec::new();
    }
    let limit = LEAST.max(TIMES * greatest);
    let sources = evidence.circuit.elements().filter_map(|(id, element)| match element.behaviour {
        Behaviour::CurrentSource(_) => Some(id),
        _ => None,
    });
    sources.filter_map(|id| judge(evidence, operating, id, limit, greatest)).collect()
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    id: ElementId,
    limit: f64,
    greatest: f64,
) -> Option<Finding> {
    let standing = evidence.standing(operating);
    let level = |node: NodeId| {
        let (low, high) = standing.node(node).filter(|_| !evidence.wiring.rails.is_rail(node))?;
        let volts = if high.abs() > low.abs() { high } else { low };
        (volts.abs() > limit).then_some((node, volts))
    };
    let (node, volts) = [0, 1].into_iter().find_map(|pin| level(evidence.circuit.node(id, pin)))?;
    if evidence.is_told_near(id) {
        return None;
    }
    let message = format!(
        "{} drives `{}` to {}, while no supply here has more than {}",
        evidence.name(id),
        evidence.node(node),
        quantity(volts, "V"),
        quantity(greatest, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("its current finds no way");
    let around = evidence.wiring.touching.at(node);
    for touch in around.iter().filter(|t| t.element != id).take(6) {
        finding =
            finding.also(evidence.statement(touch.element), "is there").about(evidence.name(touch.element));
    }
    let elements: Vec<ElementId> = around.iter().map(|t| t.element).collect();
    evidence.name_nodes(&mut finding, &elements);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
