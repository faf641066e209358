//! A pulse source whose first node is ground, so that its pulses go below ground where nothing else does.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId, Shape};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "pulse-below-ground",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a pulse source has ground as its first node, and its pulses alone go below ground",
    why: "The first node of a source is its positive end. Written with ground there, a pulse from 0 to 5 V takes its other \
          node from 0 to -5 V, in a circuit in which nothing else stands below ground.",
    remedy: "Swap the two nodes. If the pulse is to be negative, write its values so: `PULSE(0 -5 ...)`.",
    source: None,
    failing: "tide gauge buoy: word line\n\
              VCC vcc 0 5\n\
              V1 0 a PULSE(0 5 0 1u 1u 99u 200u)\n\
              R1 vcc w 1k\n\
              D1 w a DSIG\n\
              R2 w 0 47k\n\
              .tran 1u 1m\n\
              .model DSIG D(RS=1)\n",
    passing: "tide gauge buoy: word line\n\
              VCC vcc 0 5\n\
              V1 a 0 PULSE(0 5 0 1u 1u 99u 200u)\n\
              R1 vcc w 1k\n\
              D1 w a DSIG\n\
              R2 w 0 47k\n\
              .tran 1u 1m\n\
              .model DSIG D(RS=1)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let turned: Vec<ElementId> =
        circuit.elements().map(|(id, _)| id).filter(|&id| level(evidence, id).is_some()).collect();
    let [one] = turned.as_slice() else { return Vec::new() };
    let node = circuit.node(*one, 1);
    let standing = evidence.standing(operating);
    let mut others = (1..circuit.nodes.len()).map(NodeId::new).filter(|&n| n != node);
    let is_below = |n: NodeId| standing.rail(n).is_some_and(|(low, _)| low < 0.0);
    // a clamp that stops it at ground says that it is meant
    let is_stopped = evidence.wiring.touching.at(node).iter().any(|t| {
        t.pin == 1
            && matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
            && circuit.node(t.element, 0) == NodeId::GROUND
    });
    if is_stopped || others.any(is_below) {
        return Vec::new();
    }
    level(evidence, *one).map(|level| judge(evidence, *one, node, level)).into_iter().collect()
}

/// The height of a pulse that is written as a positive one and stands on ground.
fn level(evidence: &Evidence<'_>, id: ElementId) -> Option<f64> {
    let circuit = evidence.circuit;
    let Behaviour::VoltageSource(source) = &circuit.element(id).behaviour else { return None };
    let Some(Shape::Pulse { low, high, .. }) = source.shape else { return None };
    let stands_on_ground = circuit.node(id, 0) == NodeId::GROUND && circuit.node(id, 1) != NodeId::GROUND;
    (stands_on_ground && low.min(high) >= 0.0 && low != high).then_some(low.max(high))
}

fn judge(evidence: &Evidence<'_>, id: ElementId, node: NodeId, level: f64) -> Finding {
    let (name, node) = (evidence.name(id), evidence.node(node));
    let message = format!(
        "{name} takes `{node}` to {}, below ground, where nothing else of this circuit goes",
        quantity(-level, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("its positive end is ground").about(&node);
    evidence.name_nodes(&mut finding, &[id]);
    turn_round(evidence, id, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
