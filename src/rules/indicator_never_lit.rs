//! A light-emitting diode that gets some forward voltage in every condition, but never enough.

use super::{Check, Evidence, Group, Rule, behind};
use crate::circuit::{Behaviour, ElementId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "indicator-never-lit",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a light-emitting diode stands at less than its drop in every condition, so it never lights",
    why: "Something across it, or too many diodes in series with it, leaves it less than the voltage it needs, so it \
          stays dark whatever happens.",
    remedy: "Look for what holds its node down: another string, a wire to the wrong node, a missing resistor of its own.",
    source: None,
    failing: "tide gauge buoy: two lamps on one resistor\n\
              VBUS bus 0 12\n\
              R1 bus lamps 470\n\
              DRED lamps 0 LRED\n\
              DBLUE lamps 0 LBLUE\n\
              .model LRED D(IS=1e-18 N=2)\n\
              .model LBLUE D(IS=1e-27 N=2)\n",
    passing: "tide gauge buoy: two lamps, each with its resistor\n\
              VBUS bus 0 12\n\
              R1 bus lamp1 470\n\
              R2 bus lamp2 470\n\
              DRED lamp1 0 LRED\n\
              DBLUE lamp2 0 LBLUE\n\
              .model LRED D(IS=1e-18 N=2)\n\
              .model LBLUE D(IS=1e-27 N=2)\n",
    check: Check::States(check),
};

/// Less than this forward is no attempt to light it.
const SOME: f64 = 0.2;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let is_diode = |b: &Behaviour| matches!(b, Behaviour::Diode { .. });
    let diodes = evidence.circuit.elements().filter(|(_, e)| is_diode(&e.behaviour));
    diodes.filter_map(|(id, _)| judge(evidence, operating, id)).collect()
}

/// It and its resistor lie across a small resistance: they show that too much flows there.
fn shows_overload(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let (one, two) = (behind(evidence, id, 0).end, behind(evidence, id, 1).end);
    let joins = |other: ElementId| {
        let ends = [circuit.node(other, 0), circuit.node(other, 1)];
        matches!(&circuit.element(other).behaviour, Behaviour::Resistor(ohms) if ohms.number <= SHUNT)
            && ends.contains(&one)
            && ends.contains(&two)
    };
    one != two && evidence.wiring.touching.at(one).iter().any(|t| joins(t.element))
}

/// Ohms up to which a resistor measures a current.
const SHUNT: f64 = 10.0;

/// Another diode lies across it the other way round: the pair is driven both ways, one of them at a time, and three
/// lines of such pairs leave some voltage across those that are not meant.
fn has_partner(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let (anode, cathode) = (circuit.node(id, 0), circuit.node(id, 1));
    let is_partner = |other: ElementId| {
        matches!(circuit.element(other).behaviour, Behaviour::Diode { .. }) && circuit.node(other, 1) == anode
    };
    evidence.wiring.touching.at(cathode).iter().any(|t| t.pin == 0 && is_partner(t.element))
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let seen = evidence.standing(operating).diode(id)?;
    let is_dark =
        seen.is_led() && seen.is_always(State::Blocking) && seen.least.is_finite() && seen.least >= SOME;
    if !is_dark
        || seen.greatest >= seen.drop
        || has_partner(evidence, id)
        || shows_overload(evidence, id)
        || evidence.is_told_near(id)
    {
        return None;
    }
    let message = format!(
        "{} never lights: it stands at {} at most and needs {}",
        evidence.name(id),
        quantity(seen.greatest, "V"),
        quantity(seen.drop, "V")
    );
    let mut finding = evidence.about(&RULE, id, message).label("stays dark");
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
