//! A diode that blocks in every condition, though the part behind it has no other feed.

use super::{Check, Evidence, Group, Regions, Rule, Seen, behind, list, turn_round};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "starved-part",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode holds off the feed in every condition, and what lies behind it has no other",
    why: "In every condition that was examined the diode blocks against a voltage that it was to pass on, so what it \
          feeds gets nothing.",
    remedy: "Turn the diode round, or the source behind it if that is what stands on its head. If it is meant to block \
             here and to feed in another condition, declare that one: `*@ range SOURCE LOW HIGH`.",
    source: None,
    failing: "tide gauge buoy: logger behind its series diode\n\
              VBAT bat 0 12\n\
              D1 logger bat DRECT\n\
              C1 logger 0 100u\n\
              RLOG logger 0 220\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    passing: "tide gauge buoy: logger behind its series diode\n\
              VBAT bat 0 12\n\
              D1 bat logger DRECT\n\
              C1 logger 0 100u\n\
              RLOG logger 0 220\n\
              .model DRECT D(IS=2.5n N=1.7)\n",
    check: Check::States(check),
};

/// A diode that blocks against less than this may just have nothing to pass on.
const HELD_OFF: f64 = 1.0;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let standing = evidence.standing(operating);
    let blocks = |id: ElementId| standing.diode(id).is_some_and(|d| d.is_always(State::Blocking));
    let circuit = evidence.circuit;
    let diodes: Vec<ElementId> = circuit
        .elements()
        .filter(|(id, e)| matches!(e.behaviour, Behaviour::Diode { .. }) && blocks(*id))
        .map(|(id, _)| id)
        .collect();
    if diodes.is_empty() || evidence.is_groundless() {
        return Vec::new();
    }
    let regions = Regions::of(evidence, blocks);
    let mut starved: BTreeMap<u32, Vec<(ElementId, usize)>> = BTreeMap::new();
    for &id in &diodes {
        let Some(seen) = standing.diode(id) else { continue };
        for pin in [0, 1] {
            let (inside, outside) = (circuit.node(id, pin), circuit.node(id, 1 - pin));
            if evidence.wiring.rails.is_rail(inside) || !holds_off(seen) {
                continue;
            }
            let region = regions.region(inside);
            let feeds = match evidence.wiring.rails.is_rail(outside) {
                true => outside != NodeId::GROUND,
                false => regions.region(outside) != region && !regions.is_unfed(regions.region(outside)),
            };
            if regions.is_unfed(region) && feeds {
                starved.entry(region).or_default().push((id, pin));
            }
        }
    }
    let fed = consumers(evidence, &regions, &starved);
    let none = Vec::new();
    let judged = starved.iter().filter_map(|(region, feeders)| {
        judge(evidence, &regions, fed.get(region).unwrap_or(&none), feeders, operating)
    });
    judged.collect()
}

/// It blocks, and against a voltage that it might have passed on.
fn holds_off(seen: &Seen) -> bool {
    seen.greatest <= 0.0 && seen.least <= -HELD_OFF
}

fn judge(
    evidence: &Evidence<'_>,
    regions: &Regions,
    fed: &[ElementId],
    feeders: &[(ElementId, usize)],
    operating: &Operating,
) -> Option<Finding> {
    let circuit = evidence.circuit;
    let &(id, pin) = feeders.first()?;
    // the node of a clamp pair and nothing else: the pair is as it should be
    if fed.is_empty() || evidence.is_told_near(id) || is_clamped(evidence, circuit.node(id, pin)) {
        return None;
    }
    let seen = *evidence.standing(operating).diode(id)?;
    let nodes = fed.iter().flat_map(|&e| circuit.pins(e)).map(|p| p.node).filter(|&n| n != NodeId::GROUND);
    let signal =
        |n: NodeId| !evidence.wiring.rails.is_rail(n) && super::points_at_its_source::is_coupled(evidence, n);
    if seen.clamps_near(-seen.least)
        || is_sensor(evidence, &seen, fed)
        || is_slowed(evidence, id, pin)
        || nodes.into_iter().any(signal)
    {
        return None;
    }
    let name = evidence.name(id);
    let names: Vec<String> = fed.iter().map(|&e| evidence.name(e)).collect();
    let verb = if names.len() == 1 { "has" } else { "have" };
    let message = format!(
        "{name} blocks in every condition (it holds off {}), and {} {verb} no other feed",
        quantity(-seen.least, "V"),
        list(&names)
    );
    let mut finding = evidence.about(&RULE, id, message).label("points against what it is to pass on");
    for &consumer in fed.iter().take(3) {
        finding = finding.also(evidence.statement(consumer), "gets nothing");
    }
    let walk = behind(evidence, id, 1 - pin);
    if let Some(source) = evidence.wiring.rails.source(walk.end) {
        finding = finding.also(evidence.statement(source), "is to feed it");
        finding.subjects.push(evidence.name(source));
        finding.subjects.push(evidence.node(walk.end));
    }
    let outside = circuit.node(id, 1 - pin);
    if !evidence.wiring.rails.is_rail(outside) {
        for &rail in regions.borders(regions.region(outside)).iter().take(4) {
            if let Some(source) = evidence.wiring.rails.source(rail) {
                finding.subjects.extend([evidence.name(source), evidence.node(rail)]);
            }
        }
    }
    finding.subjects.extend(feeders.iter().skip(1).map(|&(d, _)| evidence.name(d)));
    finding.subjects.extend(names);
    evidence.name_nodes(&mut finding, fed);
    evidence.name_nodes(&mut finding, &feeders.iter().map(|f| f.0).collect::<Vec<_>>());
    let finding = finding.help(format!("{} {}", RULE.why, RULE.remedy));
    Some(if feeders.len() == 1 { turn_round(evidence, id, finding) } else { finding })
}

/// A junction held in reverse with one large resistor after it is read by what it leaks: a photodiode.
fn is_sensor(evidence: &Evidence<'_>, seen: &Seen, fed: &[ElementId]) -> bool {
    let ohms = |&id: &ElementId| match &evidence.circuit.element(id).behaviour {
        Behaviour::Resistor(ohms) => ohms.number,
        _ => 0.0,
    };
    !seen.is_led() && fed.len() == 1 && fed.iter().all(|id| ohms(id) >= LEAKAGE)
}

/// Ohms from which on a resistor is there for a leakage current.
const LEAKAGE: f64 = 10_000.0;

/// A freewheel diode whose resistor makes the current of its coil die faster.
fn is_slowed(evidence: &Evidence<'_>, id: ElementId, pin: usize) -> bool {
    let circuit = evidence.circuit;
    let (inside, outside) = (circuit.node(id, pin), circuit.node(id, 1 - pin));
    super::forward_when_switched::freewheels_to(evidence, outside, id, inside).is_some()
}

/// What lies in each starved region and takes current, in order; all elements gone through once.
fn consumers(
    evidence: &Evidence<'_>,
    regions: &Regions,
    starved: &BTreeMap<u32, Vec<(ElementId, usize)>>,
) -> BTreeMap<u32, Vec<ElementId>> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut fed: BTreeMap<u32, Vec<ElementId>> = BTreeMap::new();
    for (id, element) in circuit.elements() {
        let takes = matches!(
            element.behaviour,
            Behaviour::Resistor(_) | Behaviour::Inductor { .. } | Behaviour::Transistor { .. }
        );
        if !takes {
            continue;
        }
        for pin in circuit.pins(id).iter().take(2).filter(|p| !rails.is_rail(p.node)) {
            let region = regions.region(pin.node);
            if !starved.contains_key(&region) {
                continue;
            }
            let inside = fed.entry(region).or_default();
            if inside.last() != Some(&id) {
                inside.push(id);
            }
        }
    }
    fed
}

/// A diode from ground (or another rail) and one to a rail meet there.
fn is_clamped(evidence: &Evidence<'_>, node: NodeId) -> bool {
    let circuit = evidence.circuit;
    let toward = |pin: u32| {
        evidence.wiring.touching.at(node).iter().any(|t| {
            t.pin == pin
                && matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
                && evidence.wiring.rails.is_rail(circuit.node(t.element, 1 - pin as usize))
        })
    };
    toward(0) && toward(1)
}
