//! An input whose clamp conducts whatever happens: the input stands beyond its rails.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::topology::is_lead;

pub const RULE: Rule = Rule {
    name: "clamp-in-use",
    group: Group::Orientation,
    severity: Severity::Warning,
    also: None,
    summary: "one of the two clamps of an input conducts in every condition",
    why: "A pair of clamps to both rails speaks only when something drives its input beyond them. One that always conducts \
          means that the input is never a signal: its source has the wrong polarity, a resistor to hold it is missing, or \
          it is joined to the wrong node.",
    remedy: "Look at what drives the input. Where the overload is what this file is about, declare the signal's span: \
             `*@ range SOURCE LOW HIGH`.",
    source: Some("Clamps to both rails protect inputs against overload only, common practice"),
    failing: "tide gauge buoy: current loop input\n\
              V33 v33 0 3.3\n\
              R33 v33 0 330\n\
              ILOOP in 0 12m\n\
              RSH in 0 150\n\
              R1 in adc 1k\n\
              DU adc v33 DSIG\n\
              DL 0 adc DSIG\n\
              R2 adc 0 1meg\n\
              .model DSIG D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: current loop input\n\
              V33 v33 0 3.3\n\
              R33 v33 0 330\n\
              ILOOP 0 in 12m\n\
              RSH in 0 150\n\
              R1 in adc 1k\n\
              DU adc v33 DSIG\n\
              DL 0 adc DSIG\n\
              R2 adc 0 1meg\n\
              .model DSIG D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let diodes = evidence.circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    diodes.filter_map(|(id, _)| judge(evidence, operating, id)).collect()
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, id: ElementId) -> Option<Finding> {
    let circuit = evidence.circuit;
    let seen = evidence.standing(operating).diode(id)?;
    let rails = &evidence.wiring.rails;
    let input = [0, 1].into_iter().find(|&pin| !rails.is_rail(circuit.node(id, pin)))?;
    let (node, rail) = (circuit.node(id, input), circuit.node(id, 1 - input));
    if !seen.is_always(State::Conducting) || seen.is_led() || !rails.is_rail(rail) {
        return None;
    }
    let partners = partners(evidence, id, node, input as u32, rail);
    // what the one passes on to the other is no input
    let standing = evidence.standing(operating);
    let rests = |&p: &ElementId| standing.diode(p).is_some_and(|d| d.is_always(State::Blocking));
    if partners.is_empty() || !partners.iter().all(rests) || evidence.is_told_near(id) {
        return None;
    }
    let (name, held) = (evidence.name(id), evidence.node(rail));
    let message = format!(
        "{name} conducts in every condition ({} at most): `{}` always stands beyond `{held}`",
        quantity(seen.current, "A"),
        evidence.node(node)
    );
    let mut finding = evidence.about(&RULE, id, message).label("always clamps");
    for &partner in &partners {
        finding = finding.also(evidence.statement(partner), "its partner").about(evidence.name(partner));
    }
    evidence.name_nodes(&mut finding, &[id]);
    let drivers = around(evidence, node);
    for &driver in &drivers {
        finding = finding.also(evidence.statement(driver), "drives it").about(evidence.name(driver));
    }
    evidence.name_nodes(&mut finding, &drivers);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// The diodes that lead to, or from, another rail.
fn partners(evidence: &Evidence<'_>, id: ElementId, node: NodeId, pin: u32, rail: NodeId) -> Vec<ElementId> {
    let circuit = evidence.circuit;
    let touches = evidence.wiring.touching.at(node).iter();
    let others = touches.filter(|t| {
        let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
        t.element != id
            && t.pin != pin
            && far != rail
            && matches!(circuit.element(t.element).behaviour, Behaviour::Diode { .. })
            && evidence.wiring.rails.is_rail(far)
    });
    others.map(|t| t.element).collect()
}

/// Sources looked for this many nodes away.
const NEAR: usize = 8;

/// The sources that drive a node through resistors: at the nodes between, or holding the ends.
fn around(evidence: &Evidence<'_>, node: NodeId) -> Vec<ElementId> {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    let mut nodes = vec![node];
    let mut found: Vec<ElementId> = Vec::new();
    let mut at = 0;
    while let Some(&node) = nodes.get(at) {
        at += 1;
        if rails.is_rail(node) {
            found.extend(rails.source(node));
            continue;
        }
        for touch in evidence.wiring.touching.at(node) {
            match &circuit.element(touch.element).behaviour {
                Behaviour::CurrentSource(_) => found.push(touch.element),
                b if is_lead(b) => {
                    let far = circuit.node(touch.element, 1 - touch.pin.min(1) as usize);
                    if nodes.len() < NEAR && !nodes.contains(&far) {
                        nodes.push(far);
                    }
                }
                _ => {}
            }
        }
    }
    found.sort();
    found.dedup();
    found
}
