//! A base that nothing drives, and an insulated gate that only a transistor or a switch drives: with that one off,
//! nothing holds it.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, Circuit, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::{Touch, can_break_down, is_sensing, main_path};
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "undriven-control",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "nothing drives a base, or holds an insulated gate while its driver is off",
    why: "A gate takes no current, so it keeps what charge it has and leakage decides whether the transistor is on: a load \
          that should be off then gets warm or stays on. A base that nothing feeds never turns its transistor on.",
    remedy: "Join a base to what is to drive it. Put a resistor from a gate to the potential at which the transistor is \
             off, usually its source.",
    source: None,
    failing: "tide gauge buoy: high-side switch of the modem\n\
              VBUS bus 0 12\n\
              M1 modem gate bus bus PSW\n\
              RON gate pull 10k\n\
              Q1 pull base 0 QSW\n\
              VON on 0 3.3\n\
              RB on base 10k\n\
              RMOD modem 0 82\n\
              .model PSW PMOS(VTO=-2 KP=10)\n\
              .model QSW NPN(IS=14f BF=200)\n",
    passing: "tide gauge buoy: float switch\n\
              VBUS bus 0 12\n\
              RPULL bus sense 10k\n\
              RLOW sense 0 100k\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut told: FxHashSet<NodeId> = FxHashSet::default();
    let mut findings = Vec::new();
    if evidence.is_groundless() {
        return findings;
    }
    for (id, element) in circuit.elements() {
        let gate = match element.behaviour {
            Behaviour::Transistor { model: Some(_) } if element.letter != b'J' => circuit.node(id, 1),
            _ => continue,
        };
        if told.contains(&gate) {
            continue;
        }
        let Some(lead) = lead_of(evidence, gate) else { continue };
        let is_left = match element.letter {
            b'M' => !lead.drivers.is_empty() && !lead.is_held() && !lead.is_memory(evidence),
            // a base takes current, so a driver that is off leaves it at rest
            _ => {
                let emitter = circuit.node(id, 2);
                let is_rail = evidence.wiring.rails.is_rail(emitter);
                gate != emitter && lead.is_idle(emitter, is_rail, feeds(circuit, id))
            }
        };
        if !is_left {
            continue;
        }
        told.extend(&lead.nodes);
        findings.push(judge(evidence, id, gate, &lead));
    }
    findings
}

/// What a gate hangs on.
#[derive(Default)]
struct Lead {
    /// Nodes joined to it by resistors and inductors.
    nodes: Vec<NodeId>,
    /// Transistors and switches there, with what they do to it when on.
    drivers: Vec<(ElementId, Pull)>,
    /// Diodes there that lead to no rail.
    diodes: Vec<Pull>,
    /// Diodes to rails: clamps of a gate, perhaps the drive of a base.
    rail_diodes: Vec<(NodeId, Pull)>,
    /// Rails there.
    rails: Vec<NodeId>,
    /// Where capacitors lead from there.
    couplings: Vec<NodeId>,
}

/// Which way a driver takes the gate.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Pull {
    Up,
    Down,
    Either,
}

impl Lead {
    /// Nothing there drives the base of a transistor whose emitter is at `emitter` and that what pulls `feeds` turns on.
    fn is_idle(&self, emitter: NodeId, is_rail: bool, feeds: Pull) -> bool {
        let helps = |pull: Pull| pull == feeds || pull == Pull::Either;
        // nothing comes up from ground but to what lies below it
        let reaches =
            |rail: NodeId| rail != emitter && (rail != NodeId::GROUND || feeds == Pull::Down || is_rail);
        let is_fed = self.diodes.iter().any(|&d| helps(d))
            || self.rail_diodes.iter().any(|&(rail, d)| reaches(rail) && helps(d));
        let is_coupled = self.couplings.iter().any(|&far| far != emitter);
        self.drivers.is_empty() && !is_fed && !is_coupled && self.rails.iter().all(|&rail| rail == emitter)
    }

    /// The gate is a memory: its capacitor keeps what one switch has passed on to it.
    fn is_memory(&self, evidence: &Evidence<'_>) -> bool {
        let circuit = evidence.circuit;
        let passes_on = |id: ElementId| {
            let ends = main_path(circuit, id).map(|(a, b)| [circuit.node(id, a), circuit.node(id, b)]);
            let far = ends.and_then(|ends| ends.into_iter().find(|n| !self.nodes.contains(n)));
            far.is_some_and(|n| {
                !evidence.wiring.rails.is_rail(n) || evidence.wiring.rails.source(n).is_some()
            })
        };
        match self.drivers.as_slice() {
            [(one, _)] => !self.couplings.is_empty() && passes_on(*one),
            _ => false,
        }
    }

    /// One of several is always on: a push-pull stage, a change-over switch, a gate of diodes with its pull.
    fn is_held(&self) -> bool {
        let pulls = || self.drivers.iter().map(|d| d.1).chain(self.diodes.iter().copied());
        let either = pulls().filter(|&p| p == Pull::Either).count();
        let both = pulls().any(|p| p == Pull::Up) && pulls().any(|p| p == Pull::Down);
        !self.rails.is_empty() || both || either > 1 || (either == 1 && pulls().count() > 1)
    }
}

/// Nodes of a lead that are gone through at most.
const WIDEST: usize = 64;

/// `None` where something holds it.
fn lead_of(evidence: &Evidence<'_>, gate: NodeId) -> Option<Lead> {
    let circuit = evidence.circuit;
    let noted = &evidence.wiring.noted;
    let mut lead = Lead { nodes: vec![gate], ..Lead::default() };
    let mut at = 0;
    while let Some(&node) = lead.nodes.get(at) {
        at += 1;
        // so many things join at a supply only
        let many = evidence.wiring.touching.at(node).len() > WIDEST && !evidence.wiring.rails.is_rail(node);
        if noted.is_supplied(node) || lead.nodes.len() > WIDEST || many {
            return None;
        }
        if evidence.wiring.rails.is_rail(node) {
            lead.rails.push(node);
            continue;
        }
        for &touch in evidence.wiring.touching.at(node) {
            match circuit.element(touch.element).behaviour {
                _ if is_sensing(circuit, touch.element, touch.pin as usize) => {}
                Behaviour::Capacitor { .. } => {
                    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                    lead.couplings.push(far);
                }
                Behaviour::Inductor { .. } if evidence.is_coupled(touch.element) => return None,
                Behaviour::Resistor(_) | Behaviour::Inductor { .. } => {
                    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                    if !lead.nodes.contains(&far) {
                        lead.nodes.push(far);
                    }
                }
                Behaviour::Diode { .. } => {
                    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                    match evidence.wiring.rails.is_rail(far) {
                        true => lead.rail_diodes.push((far, diode_pull(evidence, touch))),
                        false => lead.diodes.push(diode_pull(evidence, touch)),
                    }
                }
                Behaviour::Transistor { .. } => match transistor_pull(circuit, touch) {
                    Some(Some(pull)) => lead.drivers.push((touch.element, pull)),
                    Some(None) => {}
                    None => return None,
                },
                Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. } => {
                    lead.drivers.push((touch.element, Pull::Either));
                }
                // a source holds it, and what is not known may
                _ => return None,
            }
        }
    }
    Some(lead)
}

/// Which way a base must be pulled to turn its transistor on.
fn feeds(circuit: &Circuit, id: ElementId) -> Pull {
    let is_pnp = |m| circuit.model(m).kind == ModelKind::Pnp;
    match circuit.element(id).behaviour {
        Behaviour::Transistor { model: Some(model) } if is_pnp(model) => Pull::Down,
        _ => Pull::Up,
    }
}

/// Which way a diode pulls: one that may break down, either way.
fn diode_pull(evidence: &Evidence<'_>, touch: Touch) -> Pull {
    match touch.pin {
        _ if can_break_down(evidence.circuit, touch.element, ZENER) => Pull::Either,
        0 => Pull::Down,
        _ => Pull::Up,
    }
}

/// Beyond this, in volts, a breakdown voltage is a limit.
const ZENER: f64 = 60.0;

/// `Some(None)` for a gate, which does nothing; `None` where the model does not tell.
fn transistor_pull(circuit: &Circuit, touch: Touch) -> Option<Option<Pull>> {
    let element = circuit.element(touch.element);
    let Behaviour::Transistor { model } = element.behaviour else { return None };
    let (one, two) = main_path(circuit, touch.element)?;
    let pin = touch.pin as usize;
    if pin == 1 {
        return Some(None);
    }
    let sinks = match (circuit.model(model?).kind, pin) {
        (ModelKind::Npn | ModelKind::Nmos, pin) if pin == one => true,
        (ModelKind::Pnp | ModelKind::Pmos, pin) if pin == one => false,
        (ModelKind::Npn, pin) if pin == two => false,
        (ModelKind::Pnp, pin) if pin == two => true,
        _ => return None,
    };
    Some(Some(if sinks { Pull::Down } else { Pull::Up }))
}

fn judge(evidence: &Evidence<'_>, id: ElementId, gate: NodeId, lead: &Lead) -> Finding {
    let name = evidence.name(id);
    let drivers: Vec<String> = lead.drivers.iter().map(|d| evidence.name(d.0)).collect();
    let message = match drivers.as_slice() {
        [] => format!("nothing drives the base of {name} (`{}`), so it never turns on", evidence.node(gate)),
        drivers => format!(
            "nothing holds the gate of {name} (`{}`) while {} {} off",
            evidence.node(gate),
            list(drivers),
            if drivers.len() == 1 { "is" } else { "are" }
        ),
    };
    let label =
        if drivers.is_empty() { "its base is driven by nothing" } else { "its gate is left to leakage" };
    let mut finding = evidence.about(&RULE, id, message).label(label);
    for &(driver, _) in lead.drivers.iter().take(4) {
        finding = finding.also(evidence.statement(driver), "its only driver");
    }
    finding.subjects.extend(drivers);
    finding.subjects.extend(lead.nodes.iter().map(|&n| evidence.node(n)));
    evidence.name_nodes(&mut finding, &[id]);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
