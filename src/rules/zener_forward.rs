//! A Zener diode across a supply that conducts forward instead of breaking down.

use super::{Check, Evidence, Group, Rule, turn_round};
use crate::circuit::{Behaviour, ElementId, ModelKind, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "zener-forward",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a Zener or surge diode across a supply lies in its forward direction",
    why: "There is voltage enough to hold the diode at its breakdown voltage, but it conducts forward in every condition \
          and holds the node at less than a volt instead.",
    remedy: "Turn it round: a Zener diode has its cathode at the positive end. If the source behind it stands on its \
             head, turn that one.",
    source: None,
    failing: "tide gauge buoy: reference of the pressure cell\n\
              VBUS bus 0 12\n\
              R1 bus vref 470\n\
              D1 vref 0 DZ5V1\n\
              RCELL vref 0 3k3\n\
              .model DZ5V1 D(IS=1n N=1.3 RS=7 BV=5.1)\n",
    passing: "tide gauge buoy: reference of the pressure cell\n\
              VBUS bus 0 12\n\
              R1 bus vref 470\n\
              D1 0 vref DZ5V1\n\
              RCELL vref 0 3k3\n\
              .model DZ5V1 D(IS=1n N=1.3 RS=7 BV=5.1)\n",
    check: Check::States(check),
};

/// Junctions with less are Schottky or germanium: their breakdown voltage is a limit, not a use.
const SILICON: f64 = 0.35;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    // what would stand without the diode is no more than sources give, but for amplifiers and current sources
    let most = BEYOND * evidence.standing(operating).greatest_rail();
    let diodes = evidence.circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    diodes
        .filter_map(|(id, _)| {
            judge(evidence, operating, id, most).or_else(|| at_follower(evidence, operating, id))
        })
        .collect()
}

/// A Zener diode that is to set the base of a follower, which no state judges because of the transistor.
fn at_follower(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Diode { model: Some(model), .. } = circuit.element(id).behaviour else { return None };
    let breakdown = circuit.model(model).parameter("bv")?.number.abs();
    let seen = evidence.standing(operating).diode(id);
    let is_zener = seen.is_none_or(|s| (SILICON..LAMP).contains(&s.drop)) && breakdown <= RECTIFIER;
    if !is_zener || seen.is_some_and(|s| s.always.is_some()) {
        return None;
    }
    let (anode, cathode) = (circuit.node(id, 0), circuit.node(id, 1));
    let follower = follower_at(evidence, operating, anode, cathode, ModelKind::Npn)
        .or_else(|| follower_at(evidence, operating, cathode, anode, ModelKind::Pnp))?;
    let (name, transistor) = (evidence.name(id), evidence.name(follower));
    let message = format!(
        "{name} is to hold the base of {transistor} at its breakdown voltage of {}, but lies forward there and holds it \
         one drop from `{}`",
        quantity(breakdown, "V"),
        evidence.node(if circuit.node(follower, 1) == anode { cathode } else { anode })
    );
    let mut finding = evidence
        .about(&RULE, id, message)
        .label("forward at the base")
        .also(evidence.statement(follower), "the follower that it sets")
        .about(transistor);
    evidence.name_nodes(&mut finding, &[id]);
    Some(turn_round(evidence, id, finding.help(format!("{} {}", RULE.why, RULE.remedy))))
}

/// A transistor of that kind with its base at `base` and its emitter at no rail, where `reference` is ground.
fn follower_at(
    evidence: &Evidence<'_>,
    operating: &Operating,
    base: NodeId,
    reference: NodeId,
    kind: ModelKind,
) -> Option<ElementId> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    if rails.is_rail(base) || reference != NodeId::GROUND {
        return None;
    }
    let sign = if kind == ModelKind::Npn { 1.0 } else { -1.0 };
    // its load leads to ground, or further that way: the base stands on the other side
    let loaded = |id: ElementId| {
        let emitter = circuit.node(id, 2);
        let leads = evidence
            .wiring
            .touching
            .at(emitter)
            .iter()
            .filter(|t| matches!(circuit.element(t.element).behaviour, Behaviour::Resistor(_)));
        let mut ends =
            leads.map(|t| circuit.node(t.element, 1 - t.pin.min(1) as usize)).filter(|&n| rails.is_rail(n));
        let stands = |n: NodeId| {
            evidence.standing(operating).rail(n).is_some_and(|(l, h)| sign * l >= 0.0 && sign * h >= 0.0)
        };
        ends.all(stands)
    };
    let follows = |id: ElementId| match circuit.element(id).behaviour {
        Behaviour::Transistor { model: Some(model) } => {
            circuit.model(model).kind == kind && !rails.is_rail(circuit.node(id, 2)) && loaded(id)
        }
        _ => false,
    };
    let at_base = evidence.wiring.touching.at(base).iter();
    at_base.filter(|t| t.pin == 1 && follows(t.element)).map(|t| t.element).next()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId, most: f64) -> Option<Finding> {
    let seen = evidence.standing(operating).diode(id)?;
    let breakdown = seen.breakdown?;
    let rails = &evidence.wiring.rails;
    let circuit = evidence.circuit;
    // one end on a rail, the other held by what lies around it
    let (low, high) = (circuit.node(id, 1), circuit.node(id, 0));
    // at a supply it may lie in series with what that feeds
    let shunts = [low, high].contains(&NodeId::GROUND) && rails.is_rail(low) != rails.is_rail(high);
    let margin = if breakdown > RECTIFIER { 1.0 } else { MARGIN };
    let pressed = (margin * breakdown..most).contains(&seen.open_circuit);
    let would_hold = pressed && breakdown <= MOST && (SILICON..LAMP).contains(&seen.drop);
    if !seen.is_always(State::Conducting) || !shunts || !would_hold {
        return None;
    }
    let free = if rails.is_rail(low) { high } else { low };
    let message = format!(
        "{} breaks down at {} but conducts forward in every condition: it holds `{}` at {} where {} would stand without it",
        evidence.name(id),
        quantity(breakdown, "V"),
        evidence.node(free),
        quantity(seen.greatest, "V"),
        quantity(seen.open_circuit, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("forward across the supply");
    evidence.name_nodes(&mut finding, &[id]);
    let feeds = evidence.wiring.touching.direct(circuit, free).filter(|t| t.element != id);
    for touch in feeds.take(4).collect::<Vec<_>>() {
        let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
        let end =
            evidence.wiring.touching.walk(circuit, rails, far, touch.element, crate::topology::is_lead).end;
        if let Some(source) = rails.source(end) {
            finding.subjects.extend([evidence.name(source), evidence.node(end)]);
        }
    }
    Some(turn_round(evidence, id, finding.help(format!("{} {}", RULE.why, RULE.remedy))))
}

/// A surge diode is chosen to break down somewhat above its supply.
pub const MARGIN: f64 = 0.6;
/// So many times the greatest supply two supplies and a divider do not give.
const BEYOND: f64 = 3.0;
/// From here on it may be a rectifier's limit as well as a Zener diode's voltage.
pub const RECTIFIER: f64 = 40.0;
/// No Zener diode drops so much forward; an infrared lamp does.
pub const LAMP: f64 = 0.95;
/// Beyond this a breakdown voltage is a rectifier's limit.
pub const MOST: f64 = 60.0;
