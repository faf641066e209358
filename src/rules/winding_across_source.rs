//! A secondary winding straight across the source that drives its primary.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::is_lead;

pub const RULE: Rule = Rule {
    name: "winding-across-source",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "two windings of one transformer are driven by the same source",
    why: "One winding lies straight across a source that drives another winding of the same core as well. What the two \
          demand of the core differs by their turns, and only stray inductance limits the current between them.",
    remedy: "One of the two is on a wrong node: the secondary shares no node but ground with what drives the primary.",
    source: None,
    failing: "tide gauge buoy: bench supply\n\
              V1 prim 0 SIN(0 34 50)\n\
              R1 prim p 1\n\
              L1 p 0 2\n\
              L2 prim 0 350m\n\
              K1 L1 L2 0.99\n\
              D1 prim raw DRECT\n\
              R2 raw 0 1k\n\
              .model DRECT D(IS=2.6n N=1.9)\n",
    passing: "tide gauge buoy: bench supply\n\
              V1 prim 0 SIN(0 34 50)\n\
              R1 prim p 1\n\
              L1 p 0 2\n\
              L2 sec 0 350m\n\
              K1 L1 L2 0.99\n\
              R2 sec 0 1k\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let mut findings = Vec::new();
    for (_, element) in circuit.elements() {
        let Behaviour::Coupling { coils, .. } = &element.behaviour else { continue };
        for &coil in coils.iter() {
            let Some(source) = straight_across(evidence, coil) else { continue };
            let driven = coils.iter().copied().find(|&c| c != coil && is_driven_by(evidence, c, source.0));
            if let Some(other) = driven {
                findings.push(judge(evidence, coil, other, source));
            }
        }
    }
    findings
}

/// The rail other than ground at one end of a coil whose other end is ground, with its source.
fn straight_across(evidence: &Evidence<'_>, coil: ElementId) -> Option<(NodeId, ElementId)> {
    let circuit = evidence.circuit;
    let ends = [circuit.node(coil, 0), circuit.node(coil, 1)];
    let rail = ends.into_iter().find(|&n| n != NodeId::GROUND)?;
    let source = evidence.wiring.rails.source(rail)?;
    ends.contains(&NodeId::GROUND).then_some((rail, source))
}

/// A lead goes from the rail to one end of the coil.
fn is_driven_by(evidence: &Evidence<'_>, coil: ElementId, rail: NodeId) -> bool {
    let circuit = evidence.circuit;
    let rails = &evidence.wiring.rails;
    [0, 1].iter().any(|&pin| {
        let node = circuit.node(coil, pin);
        node != NodeId::GROUND
            && !rails.is_rail(node)
            && evidence.wiring.touching.at(node).iter().any(|t| {
                let far = circuit.node(t.element, 1 - t.pin.min(1) as usize);
                t.element != coil && is_lead(&circuit.element(t.element).behaviour) && far == rail
            })
    })
}

fn judge(
    evidence: &Evidence<'_>,
    coil: ElementId,
    other: ElementId,
    (rail, source): (NodeId, ElementId),
) -> Finding {
    let message = format!(
        "{} and {} are windings of one core, and {} at `{}` drives both of them",
        evidence.name(coil),
        evidence.name(other),
        evidence.name(source),
        evidence.node(rail)
    );
    let mut finding = evidence
        .about(&RULE, coil, message)
        .label("straight across the source")
        .also(evidence.statement(other), "driven as well")
        .also(evidence.statement(source), "drives both")
        .about(evidence.name(other))
        .about(evidence.name(source));
    evidence.name_nodes(&mut finding, &[coil, other]);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
