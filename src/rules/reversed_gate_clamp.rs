//! A diode between gate and source that holds the gate at a drop, so the transistor never turns on.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::gives_light;

pub const RULE: Rule = Rule {
    name: "reversed-gate-clamp",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode from gate to source conducts forward before the transistor turns on",
    why: "A clamp lets the gate rise to its breakdown voltage. The other way round it holds the gate one drop from the \
          source, which is less than an insulated gate needs.",
    remedy: "Turn it round: the cathode at the gate of an N-channel transistor, at the source of a P-channel one.",
    source: Some("Zener clamp of a gate, common practice"),
    failing: "tide gauge buoy: high-side switch\n\
              VBUS bus 0 12\n\
              M1 load gate bus bus PSW\n\
              D1 bus gate DZ10\n\
              R1 bus gate 100k\n\
              R2 gate on 22k\n\
              VON on 0 0\n\
              RL load 0 82\n\
              .model PSW PMOS(VTO=-2 KP=10)\n\
              .model DZ10 D(IS=1n N=1.3 BV=10)\n",
    passing: "tide gauge buoy: gate divider\n\
              VBUS bus 0 12\n\
              D1 0 gate DZ10\n\
              R1 bus gate 100k\n\
              R2 gate 0 22k\n\
              .model DZ10 D(IS=1n N=1.3 BV=10)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut findings = Vec::new();
    for (id, element) in circuit.elements() {
        let Behaviour::Transistor { model: Some(model) } = element.behaviour else { continue };
        let (gate, source) = (circuit.node(id, 1), circuit.node(id, 2));
        // a depletion channel conducts at 0 V: there the clamp is meant
        let threshold = circuit.model(model).parameter("vto").map_or(0.0, |v| v.number);
        let is_depletion = match circuit.model(model).kind {
            ModelKind::Nmos => threshold < 0.0,
            _ => threshold > 0.0,
        };
        if is_depletion {
            continue;
        }
        let forward = match circuit.model(model).kind {
            ModelKind::Nmos => (gate, source),
            ModelKind::Pmos => (source, gate),
            _ => continue,
        };
        let at_gate: Vec<ElementId> = diodes_between(evidence, gate, source);
        // two of them, one each way, are a matter of their own
        if let [diode] = at_gate.as_slice()
            && (circuit.node(*diode, 0), circuit.node(*diode, 1)) == forward
            && !gives_light(circuit, *diode)
        {
            findings.push(judge(evidence, *diode, id));
        }
    }
    findings
}

fn diodes_between(evidence: &Evidence<'_>, gate: NodeId, source: NodeId) -> Vec<ElementId> {
    let circuit = evidence.circuit;
    if gate == source {
        return Vec::new();
    }
    let touches = evidence.wiring.touching.at(gate).iter();
    let joins = touches.filter(|t| {
        matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
            && circuit.node(t.element, 1 - t.pin.min(1) as usize) == source
    });
    joins.map(|t| t.element).collect()
}

fn judge(evidence: &Evidence<'_>, diode: ElementId, transistor: ElementId) -> Finding {
    let (name, switch) = (evidence.name(diode), evidence.name(transistor));
    let message =
        format!("{name} holds the gate of {switch} one drop from its source, so {switch} never turns on");
    let mut finding = evidence
        .about(&RULE, diode, message)
        .label("forward where the gate is to be driven")
        .also(evidence.statement(transistor), "the transistor that it keeps off")
        .about(switch);
    evidence.name_nodes(&mut finding, &[diode]);
    turn_round(evidence, diode, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
