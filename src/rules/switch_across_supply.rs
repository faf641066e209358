//! A switch or a transistor that lies straight across a supply: closing it shorts the source.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, Circuit, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::main_path;

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
const LOAD: f64 = 10.0;

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
    let holds = |n: NodeId| n == NodeId::GROUND || rails.source(n).is_some();
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

/// Base or gate is driven by a source alone: so its characteristic is taken, and the source across it is meant.
fn is_on_a_test_bench(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let control = circuit.node(id, 1);
    let others = evidence.wiring.touching.at(control).iter().filter(|t| t.element != id);
    let mut drivers = others.map(|t| &circuit.element(t.element).behaviour);
    evidence.wiring.rails.is_rail(control) || drivers.all(|b| matches!(b, Behaviour::CurrentSource(_)))
}
