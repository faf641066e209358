//! A rectifier leg that carries nothing in a whole period.

use super::reversed_bridge_leg::legs;
use super::{Check, Evidence, Group, Regions, Rule, list};
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "idle-rectifier",
    group: Group::Time,
    severity: Severity::Note,
    also: None,
    summary: "a rectifier diode carries nothing in a whole period",
    why: "Its end of the winding never rises above what the diode feeds: the diode is the wrong way round, one of its \
          nodes is not the one that was meant, or another generator serves the load alone.",
    remedy: "Look at the nodes of the diode and of what feeds it.",
    source: None,
    failing: "tide gauge buoy: bench supply\n\
              V1 top 0 SIN(0 15 50)\n\
              R1 top wa 0.6\n\
              V2 low 0 SIN(0 6 50 0 0 180)\n\
              R2 low wb 0.6\n\
              D1 wa raw DRECT\n\
              D2 wb raw DRECT\n\
              C1 raw 0 2200u\n\
              RL raw 0 150\n\
              .tran 20u 200m\n\
              .model DRECT D(RS=40m)\n",
    passing: "tide gauge buoy: bench supply\n\
              V1 top 0 SIN(0 15 50)\n\
              R1 top wa 0.6\n\
              V2 low 0 SIN(0 15 50 0 0 180)\n\
              R2 low wb 0.6\n\
              D1 wa raw DRECT\n\
              D2 wb raw DRECT\n\
              C1 raw 0 2200u\n\
              RL raw 0 150\n\
              .tran 20u 200m\n\
              .model DRECT D(RS=40m)\n",
    check: Check::Time(check),
};

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    if !swing.periodic || swing.span.is_none() {
        return Vec::new();
    }
    let mut findings = Vec::new();
    let groups: Vec<_> = evidence.wiring.driven.iter().map(|driven| legs(evidence, driven)).collect();
    let rectifiers: FxHashSet<ElementId> = groups
        .iter()
        .flat_map(|outputs| outputs.values().flatten())
        .map(|leg| leg.diode)
        .filter(|&id| is_plain(evidence, id))
        .collect();
    if rectifiers.len() < 2 {
        return Vec::new();
    }
    let regions = Regions::of(evidence, |id| rectifiers.contains(&id));
    for outputs in &groups {
        for (&output, legs) in outputs {
            let takes = legs.len() > 1
                && legs.iter().all(|l| l.out == legs[0].out && rectifiers.contains(&l.diode))
                && !evidence.wiring.rails.is_rail(output)
                && regions.is_unfed(regions.region(output));
            let share = |id: ElementId| Some(swing.diode(id)?.over_time.as_ref()?.conducting_share);
            let idle = |id: &ElementId| share(*id) == Some(0.0);
            let (idle, busy): (Vec<ElementId>, Vec<ElementId>) = legs.iter().map(|l| l.diode).partition(idle);
            if takes && !idle.is_empty() && busy.iter().any(|&id| share(id).is_some_and(|s| s > 0.0)) {
                findings.extend(idle.iter().map(|&id| judge(evidence, swing, id, output, &busy)));
            }
        }
    }
    findings
}

/// No Zener diode: it limits and does not rectify.
fn is_plain(evidence: &Evidence<'_>, id: ElementId) -> bool {
    match evidence.circuit.element(id).behaviour {
        Behaviour::Diode { model: Some(model), .. } => {
            let bv = evidence.circuit.model(model).parameter("bv");
            bv.is_none_or(|v| v.number.abs() > MOST_OF_A_ZENER)
        }
        _ => false,
    }
}

/// Volts beyond which a breakdown voltage is a rectifier's limit.
const MOST_OF_A_ZENER: f64 = 25.0;

fn judge(
    evidence: &Evidence<'_>,
    swing: &Swing,
    id: ElementId,
    output: NodeId,
    busy: &[ElementId],
) -> Finding {
    let name = evidence.name(id);
    let others: Vec<String> = busy.iter().map(|&b| evidence.name(b)).collect();
    let level = swing.node(output).and_then(|n| n.over_time);
    let held = level.map_or_else(String::new, |l| {
        format!(" between {} and {}", quantity(l.min, "V"), quantity(l.max, "V"))
    });
    let message = format!(
        "{name} carries nothing in the whole period: {} alone {} `{}`{held}",
        list(&others),
        if others.len() == 1 { "holds" } else { "hold" },
        evidence.node(output)
    );
    let mut finding = evidence.about(&RULE, id, message).label("never conducts");
    for &other in busy.iter().take(3) {
        finding = finding.also(evidence.statement(other), "does the work alone");
    }
    finding.subjects.extend(others);
    evidence.name_nodes(&mut finding, &[id]);
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
