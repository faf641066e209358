//! A freewheel diode that points the way the transistor drives its coil, told from the transistor's type alone.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, Circuit, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::{gives_light, is_lead};

pub const RULE: Rule = Rule {
    name: "reversed-freewheel",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode across a coil passes the current that the transistor switches, past the coil",
    why: "A freewheel diode carries the coil's current on when the transistor turns off, and blocks while it is on. The \
          other way round it lies forward between supply and transistor, and only the transistor limits the current.",
    remedy: "Turn it round: its anode at the collector or drain of an NPN or N-channel transistor, its cathode at that of a \
             PNP or P-channel one.",
    source: Some("Direction of the main current by transistor type, common practice"),
    failing: "tide gauge buoy: valve driver behind a fuse\n\
              VBUS bus 0 12\n\
              RFUSE bus fused 100m\n\
              LV fused mid 80m\n\
              RV mid low 47\n\
              D1 fused low DFAST\n\
              M1 low gate 0 0 NSW\n\
              VG gate 0 0\n\
              .model NSW NMOS(VTO=2 KP=5)\n\
              .model DFAST D(IS=8n N=1.7)\n",
    passing: "tide gauge buoy: valve line behind a fuse\n\
              VBUS bus 0 12\n\
              RFUSE bus fused 100m\n\
              RV fused low 47\n\
              R1 low 0 10k\n",
    check: Check::Wiring(check),
};

/// With less a breakdown voltage is a use and not a limit: a Zener diode across a coil has its own reasons.
const ZENER: f64 = 40.0;

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut findings = Vec::new();
    for (id, _) in circuit.elements() {
        for (pin, enters) in ways(circuit, id) {
            let switched = circuit.node(id, pin);
            if evidence.wiring.rails.is_rail(switched) {
                continue;
            }
            // the pin of the diode that belongs at the switched node
            let right = if enters { 0 } else { 1 };
            for touch in evidence.wiring.touching.at(switched) {
                // a coil to the transistor's own other end is none that it switches
                let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                let turned = touch.pin == 1 - right
                    && far != circuit.node(id, 2 - pin)
                    && is_plain(circuit, touch.element);
                if turned && lies_across_coil(evidence, switched, touch.element, touch.pin) {
                    findings.push(judge(evidence, touch.element, id));
                }
            }
        }
    }
    findings.dedup_by(|a, b| a.span == b.span);
    findings
}

/// The pins of a transistor's main path, and whether its current enters there.
fn ways(circuit: &Circuit, id: ElementId) -> Vec<(usize, bool)> {
    let Behaviour::Transistor { model: Some(model) } = circuit.element(id).behaviour else {
        return Vec::new();
    };
    match circuit.model(model).kind {
        ModelKind::Npn | ModelKind::Nmos => vec![(0, true), (2, false)],
        // what hangs on an emitter or source of these is their supply
        ModelKind::Pnp | ModelKind::Pmos => vec![(0, false)],
        _ => Vec::new(),
    }
}

fn is_plain(circuit: &Circuit, id: ElementId) -> bool {
    let Behaviour::Diode { model, .. } = circuit.element(id).behaviour else { return false };
    let bv = model.and_then(|m| circuit.model(m).parameter("bv"));
    bv.is_none_or(|v| v.number.abs() > ZENER) && !gives_light(circuit, id)
}

/// A coil leads from the switched node to where the diode leads, with resistors in series with either.
fn lies_across_coil(evidence: &Evidence<'_>, switched: NodeId, diode: ElementId, pin: u32) -> bool {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let far = circuit.node(diode, 1 - pin.min(1) as usize);
    let behind = touching.walk(circuit, rails, far, diode, |b| matches!(b, Behaviour::Resistor(_))).end;
    // a motor is a coil with the voltage of its turning in series
    let passes = |b: &Behaviour| is_lead(b) || matches!(b, Behaviour::VoltageSource(_));
    let is_coil = |id: &ElementId| matches!(circuit.element(*id).behaviour, Behaviour::Inductor { .. });
    touching.direct(circuit, switched).filter(|t| t.element != diode).any(|t| {
        if !passes(&circuit.element(t.element).behaviour) || evidence.is_coupled(t.element) {
            return false;
        }
        let next = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        let mut walk = touching.walk(circuit, rails, next, t.element, passes);
        walk.passed.push(t.element);
        [far, behind].contains(&walk.end) && walk.passed.iter().any(is_coil)
    })
}

fn judge(evidence: &Evidence<'_>, diode: ElementId, transistor: ElementId) -> Finding {
    let (name, switch) = (evidence.name(diode), evidence.name(transistor));
    let message = format!(
        "{name} lies across the coil that {switch} switches and passes its current beside it whenever {switch} is on"
    );
    let mut finding = evidence
        .about(&RULE, diode, message)
        .label("forward when the transistor is on")
        .also(evidence.statement(transistor), "the transistor that switches the coil")
        .about(switch);
    evidence.name_nodes(&mut finding, &[diode]);
    turn_round(evidence, diode, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
