//! Current sources that push into nodes which nothing else lets a direct current leave.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::NodeId;
use crate::finding::{Finding, Severity, quantity};
use crate::topology::{Cut, Sum};
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "current-without-return",
    group: Group::Wiring,
    severity: Severity::Error,
    also: None,
    summary: "current sources push a direct current into nodes that it cannot leave",
    why: "What flows into a node must flow out of it. Capacitors carry no direct current and sources impose \
          theirs, so the circuit has no operating point.",
    remedy: "Give the current a path, or make the sources agree; for a capacitor that is charged over time give \
             its start with `.ic` or `ic=`.",
    source: Some(
        "Cut sets of current sources only must be excluded: Chua, Desoer & Kuh, Linear and Nonlinear \
                  Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: thermistor excitation\n\
              IEXC 0 sense 100u\n\
              CFILT sense 0 100n\n\
              VREF ref 0 2.5\n\
              RREF ref 0 10k\n",
    passing: "tide gauge buoy: thermistor excitation\n\
              IEXC 0 sense 100u\n\
              CFILT sense 0 100n\n\
              RTH sense 0 10k\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let loose: FxHashSet<NodeId> = evidence.loose_ends().iter().map(|end| end.node).collect();
    let cuts = evidence.wiring.cuts.iter().filter(|cut| !cut.driven && !cut.moving);
    cuts.filter(|cut| !cut.nodes.iter().any(|n| loose.contains(n)))
        .filter_map(|cut| judge(evidence, cut))
        .collect()
}

fn judge(evidence: &Evidence<'_>, cut: &Cut) -> Option<Finding> {
    let Sum::Volts(inflow) = cut.inflow else { return None };
    let (&source, others) = cut.sources.split_first()?;
    let names: Vec<String> = cut.sources.iter().map(|&id| evidence.name(id)).collect();
    let nodes: Vec<String> = cut.nodes.iter().map(|&n| format!("`{}`", evidence.node(n))).collect();
    let place = format!("{} {}", if nodes.len() == 1 { "node" } else { "nodes" }, list(&nodes));
    let amount = quantity(inflow.abs(), "A");
    let does = if names.len() == 1 { "drives" } else { "together drive" };
    let message = if inflow > 0.0 {
        format!("{} {does} {amount} into {place}, and nothing there lets a direct current out", list(&names))
    } else {
        format!("{} {does} {amount} out of {place}, and nothing there lets a direct current in", list(&names))
    };
    let mut finding = evidence.about(&RULE, source, message).label("drives a current that has no way on");
    for &id in others {
        finding = finding.also(evidence.statement(id), "takes part in the sum").about(evidence.name(id));
    }
    for &id in cut.leads.iter().filter(|id| !cut.sources.contains(id)).take(4) {
        finding = finding.also(evidence.statement(id), "carries no direct current").about(evidence.name(id));
    }
    finding.subjects.extend(nodes.iter().map(|n| n.trim_matches('`').to_owned()));
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
