//! A Zener diode with another diode forward across it.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;

pub const RULE: Rule = Rule {
    name: "zener-bypassed",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "a diode lies forward across a Zener diode, which therefore never breaks down",
    why: "The two share both nodes, and the forward drop of the one is less than the breakdown voltage of the other, so \
          the Zener diode sets nothing.",
    remedy: "One of the two is on a wrong node or the wrong way round; a lamp takes a resistor of its own.",
    source: None,
    failing: "tide gauge buoy: reference with a lamp\n\
              V1 vin 0 12\n\
              R1 vin ref 1k\n\
              D1 0 ref DZ6\n\
              D2 ref 0 DLAMP\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n\
              .model DLAMP D(IS=1e-18 N=2)\n",
    passing: "tide gauge buoy: reference with a lamp\n\
              V1 vin 0 12\n\
              R1 vin ref 1k\n\
              D1 0 ref DZ6\n\
              R2 ref lamp 1k\n\
              D2 lamp 0 DLAMP\n\
              .model DZ6 D(IS=1n N=1.3 BV=6.2)\n\
              .model DLAMP D(IS=1e-18 N=2)\n\
              *@ drop DLAMP 1.8\n",
    check: Check::States(check),
};

/// Beyond this a breakdown voltage is a limit, in volts.
const MOST: f64 = 60.0;
/// So much of the breakdown voltage the other may drop at most.
const SHARE: f64 = 0.9;
/// Junctions with less are Schottky or germanium, whose breakdown voltage is a limit too.
const SILICON: f64 = 0.35;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let diodes = evidence.circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    diodes.filter_map(|(id, _)| judge(evidence, operating, id)).collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let standing = evidence.standing(operating);
    let zener = standing.diode(id)?;
    let breakdown = zener.breakdown.filter(|&bv| bv <= MOST)?;
    if zener.is_led() || zener.drop < SILICON {
        return None;
    }
    let (low, high) = (circuit.node(id, 0), circuit.node(id, 1));
    if low == high || evidence.wiring.rails.is_rail(high) {
        return None;
    }
    let is_forward = |other: ElementId| {
        let is_diode = matches!(circuit.element(other).behaviour, Behaviour::Diode { .. });
        // two of one model across each other limit both ways
        is_diode
            && other != id
            && (circuit.node(other, 0), circuit.node(other, 1)) == (high, low)
            && evidence.model_name(other) != evidence.model_name(id)
    };
    let touches = evidence.wiring.touching.at(high).iter().filter(|t| t.pin == 0);
    let other = touches.map(|t| t.element).find(|&other| is_forward(other))?;
    let drop = standing.diode(other)?.drop;
    if drop > SHARE * breakdown {
        return None;
    }
    let (name, across) = (evidence.name(id), evidence.name(other));
    let message = format!(
        "{name} never breaks down at {}: {across} lies forward across it and holds `{}` at {} from `{}`",
        quantity(breakdown, "V"),
        evidence.node(high),
        quantity(drop, "V"),
        evidence.node(low)
    );
    let mut finding = evidence
        .about(&RULE, id, message)
        .label("sets nothing")
        .also(evidence.statement(other), "takes the current first")
        .about(across);
    evidence.name_nodes(&mut finding, &[id]);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
