//! A Zener diode that is to set a voltage, fed from less than that voltage.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::{is_lead, main_path};

pub const RULE: Rule = Rule {
    name: "zener-below-breakdown",
    group: Group::Orientation,
    severity: Severity::Note,
    also: None,
    summary: "a Zener diode that sets a voltage is fed from less than its breakdown voltage",
    why: "Below its breakdown voltage a Zener diode only leaks, so the voltage that a follower passes on is that of the feed \
          and moves with it.",
    remedy: "Feed it from more, or take one that breaks down at less.",
    source: None,
    failing: "tide gauge buoy: reference of the pressure cell\n\
              V1 vin 0 5\n\
              R1 vin ref 470\n\
              D1 0 ref DZ6\n\
              Q1 vin ref out QS\n\
              R2 out 0 1k\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n\
              .model QS NPN(IS=14f BF=200)\n",
    passing: "tide gauge buoy: reference of the pressure cell\n\
              V1 vin 0 12\n\
              R1 vin ref 1k2\n\
              D1 0 ref DZ6\n\
              R2 ref 0 10k\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let diodes = evidence.circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    diodes.filter_map(|(id, _)| judge(evidence, operating, id)).collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Diode { model: Some(model), .. } = circuit.element(id).behaviour else { return None };
    let breakdown = circuit.model(model).parameter("bv")?.number.abs();
    let standing = evidence.standing(operating);
    let (low, node) = (circuit.node(id, 0), circuit.node(id, 1));
    let rails = &evidence.wiring.rails;
    if !rails.is_rail(low) || rails.is_rail(node) {
        return None;
    }
    let feed = feed(evidence, id, node)?;
    if !sets_a_voltage(evidence, id, node, feed) {
        return None;
    }
    let (source, base) = (standing.rail(feed)?, standing.rail(low)?);
    let most = source.1 - base.0;
    // a source that is off or turned round is another matter
    if most >= breakdown || most <= 0.5 * breakdown {
        return None;
    }
    let name = evidence.name(id);
    let message = format!(
        "{name} never breaks down: it needs {}, and `{}` behind its resistor gives {} at most",
        quantity(breakdown, "V"),
        evidence.node(feed),
        quantity(most, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("sets nothing");
    if let Some(source) = rails.source(feed) {
        finding = finding.also(evidence.statement(source), "feeds it").about(evidence.name(source));
    }
    finding.subjects.push(evidence.node(feed));
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// A follower of the same feed stands on the node. Where none does it may be a clamp, which only speaks beyond its
/// voltage; a limiter looks just like a follower, so this is no more than a note.
fn sets_a_voltage(evidence: &Evidence<'_>, id: ElementId, node: NodeId, feed: NodeId) -> bool {
    let circuit = evidence.circuit;
    let is_follower = |other: ElementId, pin: u32| {
        let is_bipolar = circuit.element(other).letter == b'Q';
        let collector = main_path(circuit, other).map(|p| circuit.node(other, p.0));
        is_bipolar && pin == 1 && other != id && collector == Some(feed)
    };
    evidence.wiring.touching.at(node).iter().any(|t| is_follower(t.element, t.pin))
}

/// The one rail other than ground that feeds the node through resistors.
fn feed(evidence: &Evidence<'_>, id: ElementId, node: NodeId) -> Option<NodeId> {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let mut feeds = touching.direct(circuit, node).filter(|t| t.element != id).filter_map(|t| {
        if !is_lead(&circuit.element(t.element).behaviour) {
            return None;
        }
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        let end = touching.walk(circuit, rails, far, t.element, is_lead).end;
        (rails.is_rail(end) && end != NodeId::GROUND).then_some(end)
    });
    let first = feeds.next()?;
    feeds.next().is_none().then_some(first)
}
