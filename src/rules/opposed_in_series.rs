//! Two diodes in series that point against each other, with nothing else at their common node.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::can_break_down;
use rustc_hash::{FxHashMap, FxHashSet};

pub const RULE: Rule = Rule {
    name: "opposed-in-series",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
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
    let pairs = pairs(evidence);
    let mut by_diode: FxHashMap<ElementId, Vec<usize>> = FxHashMap::default();
    for (n, pair) in pairs.iter().enumerate() {
        for id in pair.diodes {
            by_diode.entry(id).or_default().push(n);
        }
    }
    // a diode that both its neighbours point against is the one that is turned, and is told once
    let mut told: FxHashSet<usize> = FxHashSet::default();
    let mut findings = Vec::new();
    for (n, pair) in pairs.iter().enumerate() {
        if told.contains(&n) {
            continue;
        }
        let between = pair.diodes.iter().find(|id| by_diode.get(id).is_some_and(|of| of.len() > 1));
        if let Some(id) = between {
            told.extend(by_diode.get(id).into_iter().flatten());
        }
        let turned = between.copied().or_else(|| odd_one(evidence, pair));
        findings.push(judge(evidence, pair, turned));
    }
    findings
}

/// Of a pair, the diode that stands alone against a string: the other has a neighbour that points its way.
fn odd_one(evidence: &Evidence<'_>, pair: &Opposed) -> Option<ElementId> {
    let follows = |id: ElementId| {
        let inner = usize::from(pair.cathodes);
        let far = evidence.circuit.node(id, 1 - inner);
        let mut touches =
            evidence.wiring.touching.carrying(evidence.circuit, far).filter(|t| t.element != id);
        let next = touches.next();
        touches.next().is_none()
            && next.is_some_and(|t| {
                evidence.circuit.element(t.element).letter == b'D' && t.pin as usize == inner
            })
    };
    let [one, two] = pair.diodes;
    match (follows(one), follows(two)) {
        (true, false) => Some(two),
        (false, true) => Some(one),
        _ => None,
    }
}

/// All pairs, in the order of their nodes.
pub fn pairs(evidence: &Evidence<'_>) -> Vec<Opposed> {
    (1..evidence.circuit.nodes.len()).filter_map(|n| pair_at(evidence, NodeId::new(n))).collect()
}

fn pair_at(evidence: &Evidence<'_>, node: NodeId) -> Option<Opposed> {
    let circuit = evidence.circuit;
    let at = evidence.wiring.touching.at(node);
    // sensing inputs are pins behind the second, so that these may be left uncounted without a look at the element
    let carrying = at.iter().filter(|t| t.pin < 2).count();
    if at.len() < 2 || carrying > 2 || evidence.wiring.noted.is_supplied(node) {
        return None;
    }
    let mut touches = evidence.wiring.touching.carrying(circuit, node);
    let (one, two) = (touches.next()?, touches.next()?);
    let is_plain = |id| {
        matches!(circuit.element(id).behaviour, Behaviour::Diode { .. })
            && !can_break_down(circuit, id, evidence.wiring.available)
    };
    let far = |t: crate::topology::Touch| circuit.node(t.element, 1 - t.pin.min(1) as usize);
    let opposed = touches.next().is_none()
        && one.element != two.element
        && one.pin == two.pin
        && is_plain(one.element)
        && is_plain(two.element)
        && far(one) != far(two);
    opposed.then_some(Opposed { diodes: [one.element, two.element], node, cathodes: one.pin == 1 })
}

fn judge(evidence: &Evidence<'_>, pair: &Opposed, turned: Option<ElementId>) -> Finding {
    let main = turned.unwrap_or(pair.diodes[1]);
    let other = if pair.diodes[0] == main { pair.diodes[1] } else { pair.diodes[0] };
    let [one, two] = pair.diodes.map(|id| evidence.name(id));
    let node = evidence.node(pair.node);
    let ends = if pair.cathodes { "cathode to cathode" } else { "anode to anode" };
    let message = format!(
        "{one} and {two} meet {ends} at node `{node}` and nothing else is joined there, so neither can conduct"
    );
    let against = evidence.name(other);
    let pin = evidence.circuit.pins(other).iter().find(|p| p.node == pair.node).map(|p| p.span);
    let mut finding = evidence.about(&RULE, main, message).about(against.clone()).about(node);
    finding.label = format!("points against {against}");
    if let Some(span) = pin {
        finding = finding.also(span, format!("{one} and {two} meet here"));
    }
    evidence.name_nodes(&mut finding, &pair.diodes);
    finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    match turned {
        Some(id) => super::support::turn_round(evidence, id, finding),
        None => finding,
    }
}
