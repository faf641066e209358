//! A switch or a transistor that lies straight across a supply: closing it shorts the source.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::{dc_value, main_path};

pub const RULE: Rule = Rule {
    name: "switch-across-supply",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "a switch or a transistor lies straight across a voltage source, so closing it shorts the source",
    why: "Both its ends are held by sources, and nothing else lies in the path: once it closes, only its own resistance \
          limits the current.",
    remedy: "Put the load into the path; usually one of its ends, or the load's, is on the wrong node.",
    source: None,
    failing: "tide gauge buoy: modem switch\n\
              VBUS bus 0 12\n\
              RMOD bus 0 82\n\
              Q1 bus base 0 QSW\n\
              VON on 0 3.3\n\
              RB on base 10k\n\
              .model QSW NPN(IS=14f BF=200)\n",
    passing: "tide gauge buoy: modem switch\n\
              VBUS bus 0 12\n\
              RMOD bus low 82\n\
              S1 low 0 on 0 SWM\n\
              VON on 0 3.3\n\
              RON on 0 10k\n\
              .model SWM SW(RON=50m ROFF=10meg VT=1.5 VH=0)\n",
    check: Check::Wiring(check),
};

/// A switch that holds more than this when closed stands for a load, in ohms.
const LOAD: f64 = 2.0;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    evidence.circuit.elements().filter_map(|(id, _)| judge(evidence, id)).collect()
}

fn judge(evidence: &Evidence<'_>, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let what = match circuit.element(id).behaviour {
        Behaviour::Transistor { .. } if !is_on_a_test_bench(evidence, id) => "turning it on",
        Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. } if !is_load(circuit, id) => {
            "closing it"
        }
        _ => return None,
    };
    let (one, two) = main_path(circuit, id)?;
    let ends = [circuit.node(id, one), circuit.node(id, two)];
    let rails = &evidence.wiring.rails;
    // a source of 0 V measures the current of what lies beyond
    let gives = |id: ElementId| match &circuit.element(id).behaviour {
        Behaviour::VoltageSource(source) => source.shape.is_some() || dc_value(source).0 != 0.0,
        _ => false,
    };
    let holds = |n: NodeId| n == NodeId::GROUND || rails.source(n).is_some_and(gives);
    if ends[0] == ends[1] || !ends.iter().all(|&n| holds(n)) {
        return None;
    }
    let name = evidence.name(id);
    let (from, to) = (evidence.node(ends[0]), evidence.node(ends[1]));
    let message = format!(
        "{name} joins `{from}` straight to `{to}`, which sources hold apart: {what} shorts them, and nothing else limits \
         the current"
    );
    let mut finding = evidence.about(&RULE, id, message).label("no load in its path");
    for source in ends.iter().filter_map(|&n| rails.source(n)) {
        finding = finding.also(evidence.statement(source), "holds one end");
        finding.subjects.push(evidence.name(source));
    }
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// Its resistance when closed is a load's.
fn is_load(circuit: &Circuit, id: ElementId) -> bool {
    let model = match circuit.element(id).behaviour {
        Behaviour::VoltageSwitch { model, .. } | Behaviour::CurrentSwitch { model, .. } => model,
        _ => None,
    };
    model.and_then(|m| circuit.model(m).parameter("ron")).is_some_and(|ron| ron.number >= LOAD)
}

/// Its characteristic is taken: base or gate is driven by a source alone or by another transistor's, a source is swept, or
/// the supply feeds nothing else.
fn is_on_a_test_bench(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let control = circuit.node(id, 1);
    let touching = &evidence.wiring.touching;
    let is_transistor = |e: ElementId| matches!(circuit.element(e).behaviour, Behaviour::Transistor { .. });
    let mut drivers = touching.at(control).iter().filter(|t| t.element != id).map(|t| t.element);
    let by_current = |e: ElementId| matches!(circuit.element(e).behaviour, Behaviour::CurrentSource(_));
    let feeds_only_it = |node: NodeId| {
        node == NodeId::GROUND
            || touching.at(node).iter().all(|t| {
                is_transistor(t.element)
                    || matches!(circuit.element(t.element).behaviour, Behaviour::VoltageSource(_))
            })
    };
    let ends = main_path(circuit, id).map(|(a, b)| [circuit.node(id, a), circuit.node(id, b)]);
    evidence.wiring.rails.is_rail(control)
        || !circuit.sweeps.is_empty()
        || touching.at(control).iter().any(|t| t.element != id && is_transistor(t.element))
        || drivers.all(by_current)
        || ends.is_some_and(|ends| ends.into_iter().all(feeds_only_it))
}
