//! A diode straight across a transistor's main path that conducts where the transistor is to block.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, Circuit, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::gives_light;

pub const RULE: Rule = Rule {
    name: "reversed-across-transistor",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode across a transistor points the way the transistor's current flows, so the load is never off",
    why: "A diode across a transistor carries the current of a coil or a line backwards. The other way round it carries \
          what the transistor is to switch, whether that is on or off.",
    remedy: "Turn it round: across NPN and N-channel transistors its cathode is at collector or drain, across PNP and \
             P-channel ones at emitter or source.",
    source: Some("Direction of the main current by transistor type, common practice"),
    failing: "tide gauge buoy: valve driver\n\
              VBUS bus 0 12\n\
              LV bus mid 80m\n\
              RV mid low 47\n\
              M1 low gate 0 0 NSW\n\
              VG gate 0 0\n\
              D1 low 0 DFAST\n\
              .model NSW NMOS(VTO=2 KP=5)\n\
              .model DFAST D(IS=8n N=1.7)\n",
    passing: "tide gauge buoy: valve line\n\
              VBUS bus 0 12\n\
              RV bus low 47\n\
              R1 low 0 10k\n\
              D1 0 low DFAST\n\
              .model DFAST D(IS=8n N=1.7)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut findings = Vec::new();
    for (id, _) in circuit.elements() {
        let Some((from, to)) = way(circuit, id) else { continue };
        if from == to {
            continue;
        }
        // the rarer end first: a supply or ground touches very much
        let touching = |n: NodeId| evidence.wiring.touching.at(n);
        let here = if touching(from).len() <= touching(to).len() { from } else { to };
        for touch in touching(here) {
            let diode = touch.element;
            let is_diode = matches!(circuit.element(diode).behaviour, Behaviour::Diode { .. });
            let counted = touch.pin == u32::from(here == to);
            // a lamp across it is switched off by it
            if is_diode
                && !gives_light(circuit, diode)
                && counted
                && is_inductive(evidence, from, to)
                && (circuit.node(diode, 0), circuit.node(diode, 1)) == (from, to)
            {
                findings.push(judge(evidence, diode, id));
            }
        }
    }
    findings
}

/// A coil lies at one of its ends, or behind one resistor: what such a diode is for. Across anything else it may be a
/// junction that the transistor takes the current from.
fn is_inductive(evidence: &Evidence<'_>, from: NodeId, to: NodeId) -> bool {
    let circuit = evidence.circuit;
    let is_coil = |id: ElementId| matches!(circuit.element(id).behaviour, Behaviour::Inductor { .. });
    let has_coil = |n: NodeId| evidence.wiring.touching.at(n).iter().any(|t| is_coil(t.element));
    let behind = |n: NodeId| {
        let resistors = evidence.wiring.touching.at(n).iter();
        let mut far = resistors
            .filter(|t| matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_)))
            .map(|t| circuit.node(t.element, 1 - t.pin.min(1) as usize));
        far.any(|n| !evidence.wiring.rails.is_rail(n) && has_coil(n))
    };
    [from, to].into_iter().filter(|&n| !evidence.wiring.rails.is_rail(n)).any(|n| has_coil(n) || behind(n))
}

/// From where to where a transistor's main current flows; `None` where its model does not tell.
fn way(circuit: &Circuit, id: ElementId) -> Option<(NodeId, NodeId)> {
    let Behaviour::Transistor { model: Some(model) } = circuit.element(id).behaviour else { return None };
    let (first, second) = (circuit.node(id, 0), circuit.node(id, 2));
    match circuit.model(model).kind {
        ModelKind::Npn | ModelKind::Nmos => Some((first, second)),
        ModelKind::Pnp | ModelKind::Pmos => Some((second, first)),
        _ => None,
    }
}

fn judge(evidence: &Evidence<'_>, diode: ElementId, transistor: ElementId) -> Finding {
    let (name, switch) = (evidence.name(diode), evidence.name(transistor));
    let message = format!(
        "{name} lies across {switch} and conducts the way {switch} does, so it never switches anything off"
    );
    let mut finding = evidence
        .about(&RULE, diode, message)
        .label("points along the transistor's current")
        .also(evidence.statement(transistor), "the transistor that it bridges")
        .about(switch);
    evidence.name_nodes(&mut finding, &[diode]);
    turn_round(evidence, diode, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
