//! A transistor whose supply, or whose drive, has the polarity of the other type.

use super::{Check, Evidence, Group, Rule, list, turn_round};
use crate::circuit::{Behaviour, ElementId, ModelKind, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::is_lead;

pub const RULE: Rule = Rule {
    name: "transistor-fed-backwards",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "the collector, base or drain of a transistor is fed with the wrong polarity",
    why: "NPN and N-channel transistors work with collector and base, or drain, above emitter or source, PNP and \
          P-channel ones below. Fed the other way round they switch nothing, and their junctions break down.",
    remedy: "Turn the source round, or take the transistor of the other type.",
    source: Some("Polarities by transistor type, common practice"),
    failing: "tide gauge buoy: latch relay driver\n\
              VBUS 0 bus 12\n\
              RCOIL bus coil 180\n\
              Q1 coil base 0 QSW\n\
              VCTRL ctrl 0 3.3\n\
              RB ctrl base 1k\n\
              .model QSW NPN(IS=14f BF=200)\n",
    passing: "tide gauge buoy: two supplies\n\
              VPOS pos 0 12\n\
              VNEG neg 0 -12\n\
              R1 pos neg 10k\n",
    check: Check::States(check),
};

/// Volts by which a terminal must stand on the wrong side.
const COLLECTOR: f64 = 0.5;
/// A base may well be held beyond its emitter to be surely off, but not further than its junction stands.
const BASE: f64 = 6.0;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let elements = evidence.circuit.elements();
    elements.filter_map(|(id, _)| judge(evidence, operating, id)).collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let Behaviour::Transistor { model: Some(model) } = circuit.element(id).behaviour else { return None };
    let sign = match circuit.model(model).kind {
        ModelKind::Npn | ModelKind::Nmos => 1.0,
        ModelKind::Pnp | ModelKind::Pmos => -1.0,
        _ => return None,
    };
    let (comes, goes) = if sign > 0.0 { (1, 0) } else { (0, 1) };
    let lower = rails_around(evidence, circuit.node(id, 2), goes).unwrap_or_default();
    let is_channel = circuit.element(id).letter == b'M';
    // turned round on purpose, with the load at its source, a channel guards against a supply that is turned round
    let guards = |rail: &NodeId| (*rail == NodeId::GROUND) != (sign > 0.0);
    if is_channel && lower.iter().any(guards) {
        return None;
    }
    let words = if is_channel { ("drain", "source") } else { ("collector", "emitter") };
    if let Some(diode) = led_away(evidence, id, sign) {
        return Some(by_diode(evidence, id, words.0, diode));
    }
    // a gate may well be held far beyond its source, and a junction tied to its collector is used as a diode
    let base =
        (!is_channel && circuit.node(id, 0) != circuit.node(id, 1)).then_some((1, BASE, ("base", words.1)));
    let tried = [Some((0, COLLECTOR, words)), base];
    tried.into_iter().flatten().find_map(|(pin, margin, words)| {
        let upper = rails_around(evidence, circuit.node(id, pin), comes)?;
        let own: Vec<NodeId> = upper.into_iter().filter(|n| !lower.contains(n)).collect();
        let (above, below) =
            (reach(evidence, operating, &own, sign)?, reach(evidence, operating, &lower, -sign)?);
        let apart = sign * above - sign * below;
        (apart < -margin).then(|| finding(evidence, id, words, (&own, above), (&lower, below)))
    })
}

/// The greatest of the rails' voltages over all conditions, for `sign` 1; the least, for −1.
fn reach(evidence: &Evidence<'_>, operating: &Operating, rails: &[NodeId], sign: f64) -> Option<f64> {
    let standing = evidence.standing(operating);
    let mut ends = Vec::new();
    for &rail in rails {
        let (low, high) = standing.rail(rail)?;
        ends.push(if sign > 0.0 { high } else { low });
    }
    ends.into_iter().max_by(|a, b| (sign * a).total_cmp(&(sign * b)))
}

/// Nodes gone through at most from one terminal.
const WIDEST: usize = 24;

/// The rails to which resistors and inductors lead from a node; `None` where a diode with that pin there, or anything else
/// but capacitors and transistors, leads the current that counts, or none is found.
fn rails_around(evidence: &Evidence<'_>, from: NodeId, leads: u32) -> Option<Vec<NodeId>> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut nodes = vec![from];
    let mut found = Vec::new();
    let mut at = 0;
    while let Some(&node) = nodes.get(at) {
        at += 1;
        if rails.is_rail(node) {
            found.push(node);
            continue;
        }
        for touch in evidence.wiring.touching.at(node) {
            match &circuit.element(touch.element).behaviour {
                b if is_lead(b) => {
                    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                    if evidence.is_coupled(touch.element) || nodes.len() > WIDEST {
                        return None;
                    }
                    if !nodes.contains(&far) {
                        nodes.push(far);
                    }
                }
                Behaviour::Diode { .. } if touch.pin == leads => return None,
                Behaviour::Capacitor { .. } | Behaviour::Diode { .. } | Behaviour::Transistor { .. } => {}
                _ => return None,
            }
        }
    }
    (!found.is_empty()).then_some(found)
}

/// The diode that leads away from what is to feed a collector or drain, where nothing else leads there but resistors,
/// transistors and capacitors to ground: with `sign` 1 current must come in, with −1 go out.
fn led_away(evidence: &Evidence<'_>, id: ElementId, sign: f64) -> Option<ElementId> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let away = if sign > 0.0 { 0 } else { 1 };
    let mut nodes = vec![circuit.node(id, 0)];
    let (mut found, mut at) = (None, 0);
    while let Some(&node) = nodes.get(at) {
        at += 1;
        if rails.is_rail(node) {
            return None;
        }
        for touch in evidence.wiring.touching.at(node) {
            let far = || circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
            match &circuit.element(touch.element).behaviour {
                Behaviour::Resistor(_) if far() == NodeId::GROUND && sign > 0.0 => {}
                b if is_lead(b) && nodes.len() < WIDEST => {
                    if !nodes.contains(&far()) {
                        nodes.push(far());
                    }
                }
                // from ground it is a clamp or a Zener diode
                Behaviour::Diode { .. } if far() == NodeId::GROUND => {}
                Behaviour::Diode { .. } if touch.pin == away => found = Some(touch.element),
                Behaviour::Capacitor { .. } if far() == NodeId::GROUND => {}
                Behaviour::Transistor { .. } if touch.element == id || touch.pin == 1 => {}
                _ => return None,
            }
        }
    }
    found
}

fn by_diode(evidence: &Evidence<'_>, id: ElementId, word: &str, diode: ElementId) -> Finding {
    let (name, leads) = (evidence.name(id), evidence.name(diode));
    let message =
        format!("nothing can feed the {word} of {name}: {leads}, the only way there, points the other way");
    let mut finding = evidence
        .about(&RULE, diode, message)
        .label("leads away from what it should feed")
        .also(evidence.statement(id), "gets nothing")
        .about(name);
    evidence.name_nodes(&mut finding, &[diode, id]);
    turn_round(evidence, diode, finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

fn finding(
    evidence: &Evidence<'_>,
    id: ElementId,
    words: (&str, &str),
    (own, above): (&[NodeId], f64),
    (lower, below): (&[NodeId], f64),
) -> Finding {
    let name = evidence.name(id);
    let nodes: Vec<String> = own.iter().map(|&n| format!("`{}`", evidence.node(n))).collect();
    let kind = evidence.circuit.element(id).letter;
    let message = format!(
        "the {} of {name} is fed from {} at {}, the {} from {}: that is the polarity of the other {} type",
        words.0,
        list(&nodes),
        quantity(above, "V"),
        words.1,
        quantity(below, "V"),
        if kind == b'M' { "channel" } else { "transistor" }
    );
    let mut finding = evidence.about(&RULE, id, message).label("stands on its head");
    evidence.name_nodes(&mut finding, &[id]);
    for &rail in own.iter().chain(lower) {
        if let Some(source) = evidence.wiring.rails.source(rail) {
            finding = finding.also(evidence.statement(source), "feeds it").about(evidence.name(source));
            evidence.name_nodes(&mut finding, &[source]);
        }
    }
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
