//! Two diodes in series that point against each other, with nothing else at their common node.

use super::{Check, Evidence, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::can_break_down;

pub const RULE: Rule = Rule {
    name: "opposed-in-series",
    group: "orientation",
    severity: Severity::Warning,
    summary: "two diodes in series point against each other, and nothing else joins their common node",
    why: "Whichever way the current wants to go, one of the two blocks it; without a breakdown voltage on either \
          model neither ever carries anything.",
    remedy: "Turn one of them round. If they are meant to clamp back to back, give their models `BV`; if \
             something is missing at the node between them, join it.",
    source: None,
    failing: "tide gauge buoy: reverse protection of the logger\n\
              VBAT bat 0 12\n\
              D1 bat mid DRECT\n\
              D2 logger mid DRECT\n\
              RLOG logger 0 220\n\
              CLOG logger 0 100u\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    passing: "tide gauge buoy: reverse protection of the logger\n\
              VBAT bat 0 12\n\
              D1 bat mid DRECT\n\
              D2 mid logger DRECT\n\
              RLOG logger 0 220\n\
              CLOG logger 0 100u\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    check: Check::Wiring(check),
};

/// Two such diodes.
pub struct Opposed {
    /// In the order of the text.
    pub diodes: [ElementId; 2],
    /// Their common node.
    pub node: NodeId,
    /// They meet with their cathodes, else with their anodes.
    pub cathodes: bool,
}

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    pairs(evidence).iter().map(|pair| judge(evidence, pair)).collect()
}

/// All pairs, in the order of their nodes.
pub fn pairs(evidence: &Evidence<'_>) -> Vec<Opposed> {
    (1..evidence.circuit.nodes.len()).filter_map(|n| pair_at(evidence, NodeId::new(n))).collect()
}

fn pair_at(evidence: &Evidence<'_>, node: NodeId) -> Option<Opposed> {
    let circuit = evidence.circuit;
    if evidence.wiring.touching.at(node).len() < 2 || evidence.wiring.noted.is_supplied(node) {
        return None;
    }
    let mut touches = evidence.wiring.touching.carrying(circuit, node);
    let (one, two) = (touches.next()?, touches.next()?);
    let is_plain =
        |id| matches!(circuit.element(id).behaviour, Behaviour::Diode { .. }) && !can_break_down(circuit, id);
    let far = |t: crate::topology::Touch| circuit.node(t.element, 1 - t.pin.min(1) as usize);
    let opposed = touches.next().is_none()
        && one.element != two.element
        && one.pin == two.pin
        && is_plain(one.element)
        && is_plain(two.element)
        && far(one) != far(two);
    opposed.then_some(Opposed { diodes: [one.element, two.element], node, cathodes: one.pin == 1 })
}

fn judge(evidence: &Evidence<'_>, pair: &Opposed) -> Finding {
    let [one, two] = pair.diodes.map(|id| evidence.name(id));
    let node = evidence.node(pair.node);
    let ends = if pair.cathodes { "cathode to cathode" } else { "anode to anode" };
    let message = format!(
        "{one} and {two} meet {ends} at node `{node}` and nothing else is joined there, so neither can conduct"
    );
    let pin = |id| evidence.circuit.pins(id).iter().find(|p| p.node == pair.node).map(|p| p.span);
    let mut finding = evidence.about(&RULE, pair.diodes[1], message).about(one.clone()).about(node);
    finding.label = format!("points against {one}");
    if let Some(span) = pin(pair.diodes[0]) {
        finding = finding.also(span, format!("{one} and {two} meet here"));
    }
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
