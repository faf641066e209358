//! A diode beside a transistor or switch that lies forward across the supply as soon as that one closes: a freewheel
//! diode or a snubber the wrong way round.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::{is_lead, main_path};

pub const RULE: Rule = Rule {
    name: "forward-when-switched",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode at a switched node conducts whenever the switch closes: a freewheel diode the wrong way round",
    why: "A freewheel diode carries the coil's current on when the switch opens, and blocks while it is closed. The \
          other way round it stands forward across the supply with nothing but the switch to limit the current.",
    remedy: "Turn it round: it points from the lower potential to the higher. If the supply itself stands on its head, \
             turn that one.",
    source: None,
    failing: "tide gauge buoy: latch relay driver\n\
              VBUS bus 0 12\n\
              LCOIL bus mid 95m\n\
              RCOIL mid drain 180\n\
              D1 bus drain DRECT\n\
              S1 drain 0 ctrl 0 SWM\n\
              VCTRL ctrl 0 0\n\
              RC ctrl 0 10k\n\
              .model DRECT D(IS=2.6n N=1.9)\n\
              .model SWM SW(RON=100m ROFF=10meg VT=1.5 VH=0)\n",
    passing: "tide gauge buoy: bus monitor\n\
              VBUS bus 0 12\n\
              R1 bus mon 47k\n\
              R2 mon 0 10k\n\
              D1 0 mon DRECT\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    check: Check::States(check),
};

/// A switch between a node and a rail.
struct Switch {
    element: ElementId,
    node: NodeId,
    rail: NodeId,
}

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut findings: Vec<Finding> = Vec::new();
    let mut told: Vec<ElementId> = Vec::new();
    for switch in switches(evidence) {
        let touches = evidence.wiring.touching.at(switch.node);
        for touch in touches {
            let is_diode =
                matches!(evidence.circuit.element(touch.element).behaviour, Behaviour::Diode { .. });
            if is_diode
                && !told.contains(&touch.element)
                && let Some(finding) = judge(evidence, operating, &switch, touch.element, touch.pin)
            {
                told.push(touch.element);
                findings.push(finding);
            }
        }
    }
    findings
}

fn switches(evidence: &Evidence<'_>) -> Vec<Switch> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut switches = Vec::new();
    for (id, element) in circuit.elements() {
        let is_switch = matches!(
            element.behaviour,
            Behaviour::Transistor { .. } | Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. }
        );
        let Some((one, two)) = main_path(circuit, id).filter(|_| is_switch) else { continue };
        if is_mirror(evidence, id) {
            continue;
        }
        let (a, b) = (circuit.node(id, one), circuit.node(id, two));
        for (node, far) in [(a, b), (b, a)] {
            let end = evidence.wiring.touching.walk(circuit, rails, far, id, is_small);
            if rails.is_rail(end.end) && !rails.is_rail(node) {
                switches.push(Switch { element: id, node, rail: end.end });
            }
        }
    }
    switches
}

/// A transistor tied as a diode sets its base or gate: half of a current mirror, which passes a set current and is no
/// switch.
fn is_mirror(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let is_transistor = |e: ElementId| matches!(circuit.element(e).behaviour, Behaviour::Transistor { .. });
    let sets = |e: ElementId| circuit.node(e, 0) == circuit.node(e, 1);
    let at_control = evidence.wiring.touching.at(circuit.node(id, 1)).iter();
    is_transistor(id) && at_control.filter(|t| is_transistor(t.element)).any(|t| sets(t.element))
}

/// What measures the current of a switch.
fn is_small(behaviour: &Behaviour) -> bool {
    matches!(behaviour, Behaviour::Resistor(ohms) if ohms.number <= 1.0)
}

fn judge(
    evidence: &Evidence<'_>,
    operating: &Operating,
    switch: &Switch,
    diode: ElementId,
    pin: u32,
) -> Option<Finding> {
    let circuit = evidence.circuit;
    let standing = evidence.standing(operating);
    let far = circuit.node(diode, 1 - pin as usize);
    let (rail, through) = match evidence.wiring.rails.is_rail(far) {
        true => (far, false),
        false => {
            let slowed = || freewheels_to(evidence, switch.node, diode, far);
            (snubbed_to(evidence, diode, far).or_else(slowed)?, true)
        }
    };
    if rail == switch.rail {
        return None;
    }
    let (here, there) = (standing.rail(rail)?, standing.rail(switch.rail)?);
    // volts that stand across the diode, forward, when the switch is closed
    let forward = if pin == 0 { there.0 - here.1 } else { here.0 - there.1 };
    let drop = standing.diode(diode).map_or(0.7, |d| d.drop);
    // a lamp shows that the switch is closed, and a diode alone at the switch is in series with it
    let is_alone = !through && !leads_to(evidence, switch.node, diode, rail, |_| true);
    if is_alone || standing.diode(diode).is_some_and(super::Seen::is_led) {
        return None;
    }
    if forward < drop + 0.5 {
        return None;
    }
    let name = evidence.name(diode);
    let what = if through {
        format!(
            "and the resistor behind it carries its current all the time that {} is on",
            evidence.name(switch.element)
        )
    } else {
        "and nothing limits its current".into()
    };
    let message = format!(
        "{name} conducts whenever {} closes: it then stands forward across {}, {what}",
        evidence.name(switch.element),
        quantity(forward, "V")
    );
    let mut finding = evidence
        .about(&RULE, diode, message)
        .label("forward when the switch is closed")
        .also(evidence.statement(switch.element), "the switch")
        .about(evidence.name(switch.element));
    for node in [rail, switch.rail] {
        if let Some(source) = evidence.wiring.rails.source(node) {
            finding = finding.also(evidence.statement(source), "drives it");
            finding.subjects.extend([evidence.name(source), evidence.node(node)]);
        }
    }
    evidence.name_nodes(&mut finding, &[diode]);
    Some(turn_round(evidence, diode, finding.help(format!("{} {}", RULE.why, RULE.remedy))))
}

/// A lead goes from a node to that rail beside the diode, by elements that are as wanted.
fn leads_to(
    evidence: &Evidence<'_>,
    from: NodeId,
    diode: ElementId,
    rail: NodeId,
    wanted: impl Fn(&[ElementId]) -> bool,
) -> bool {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    touching.direct(circuit, from).filter(|t| t.element != diode).any(|t| {
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        let mut walk = touching.walk(circuit, rails, far, t.element, is_lead);
        walk.passed.push(t.element);
        is_lead(&circuit.element(t.element).behaviour) && walk.end == rail && wanted(&walk.passed)
    })
}

/// The rail to which a resistor alone leads from the far end of the diode, where a coil leads from the switch to the
/// same one: the resistor makes its current die faster.
pub fn freewheels_to(
    evidence: &Evidence<'_>,
    switched: NodeId,
    diode: ElementId,
    node: NodeId,
) -> Option<NodeId> {
    let circuit = evidence.circuit;
    let (touching, rails) = (&evidence.wiring.touching, &evidence.wiring.rails);
    let rail = touching.walk(circuit, rails, node, diode, is_lead).end;
    if !rails.is_rail(rail) {
        return None;
    }
    let is_coil = |id: &ElementId| matches!(circuit.element(*id).behaviour, Behaviour::Inductor { .. });
    let has_coil = leads_to(evidence, switched, diode, rail, |path| path.iter().any(is_coil));
    has_coil.then_some(rail)
}

/// The rail to which a resistor and a capacitor side by side lead from the far end of a snubber's diode.
fn snubbed_to(evidence: &Evidence<'_>, diode: ElementId, node: NodeId) -> Option<NodeId> {
    let circuit = evidence.circuit;
    let (mut resistor, mut capacitor) = (None, None);
    for touch in evidence.wiring.touching.carrying(circuit, node).filter(|t| t.element != diode) {
        let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
        match &circuit.element(touch.element).behaviour {
            b if is_lead(b) && resistor.is_none() => resistor = Some(far),
            Behaviour::Capacitor { .. } if capacitor.is_none() => capacitor = Some(far),
            _ => return None,
        }
    }
    (resistor == capacitor).then_some(resistor?).filter(|&n| evidence.wiring.rails.is_rail(n))
}
