//! A node that no direct-current path joins to ground.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{ElementId, NodeId};
use crate::finding::{Finding, Severity};
use crate::topology::{Cut, Sum, is_sensing};
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "unheld-node",
    group: Group::Wiring,
    severity: Severity::Warning,
    also: None,
    summary: "nothing that passes a direct current holds a node's voltage",
    why: "Only capacitors, gates or sensing inputs touch the node, so its direct voltage drifts with the first \
          leakage and no operating point tells it.",
    remedy: "Join it through a resistance to the potential where it is to rest; if the charge on it is meant \
             to stay, give its start with `.ic`.",
    source: Some(
        "Sets of nodes that only current sources and open circuits leave have no determined potential: \
                  Chua, Desoer & Kuh, Linear and Nonlinear Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: sonar receiver input\n\
              VPING xducer 0 0\n\
              C1 xducer mid 10n\n\
              C2 mid pre 10n\n\
              R2 pre 0 100k\n",
    passing: "tide gauge buoy: sonar receiver input\n\
              VPING xducer 0 0\n\
              C1 xducer mid 10n\n\
              R1 mid 0 1meg\n\
              C2 mid pre 10n\n\
              R2 pre 0 100k\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    if evidence.is_groundless() {
        return Vec::new();
    }
    let loose: FxHashSet<NodeId> = evidence.loose_ends().iter().map(|end| end.node).collect();
    let is_told = |cut: &&Cut| cut.nodes.iter().any(|n| loose.contains(n));
    let pushed = |cut: &Cut| !cut.sources.is_empty() && !matches!(cut.inflow, Sum::Zero);
    let cuts = evidence.wiring.cuts.iter().filter(|cut| !cut.driven && !cut.isolated && !pushed(cut));
    let mut findings: Vec<Finding> =
        cuts.filter(|cut| !is_told(cut)).filter_map(|cut| judge(evidence, cut)).collect();
    findings.extend(undriven(evidence));
    findings
}

/// Nodes to which several inputs listen and which nothing drives. One alone is a loose end.
fn undriven(evidence: &Evidence<'_>) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let noted = &evidence.wiring.noted;
    let told: FxHashSet<NodeId> = evidence.wiring.cuts.iter().flat_map(|c| c.nodes.clone()).collect();
    let mut findings = Vec::new();
    for n in 1..circuit.nodes.len() {
        let node = NodeId::new(n);
        let touches = evidence.wiring.touching.at(node);
        let only_listens = !touches.is_empty()
            && touches.iter().all(|t| is_sensing(circuit, t.element, t.pin as usize))
            && evidence.wiring.touching.only(node).is_none();
        if !only_listens || told.contains(&node) || noted.is_supplied(node) || noted.is_watched(node) {
            continue;
        }
        let names: Vec<String> = touches.iter().map(|t| evidence.name(t.element)).collect();
        let Some(pin) = circuit.pins(touches[0].element).get(touches[0].pin as usize) else { continue };
        let scope = circuit.element(touches[0].element).scope;
        let message =
            format!("nothing drives node `{}`: {} only listen to it", evidence.node(node), list(&names));
        let mut finding = evidence
            .at(&RULE, scope, pin.span, message)
            .label("only inputs touch this node")
            .about(evidence.node(node))
            .help(format!("{} {}", RULE.why, RULE.remedy));
        finding.subjects.extend(names);
        findings.push(finding);
    }
    findings
}

fn judge(evidence: &Evidence<'_>, cut: &Cut) -> Option<Finding> {
    let (first, rest) = cut.nodes.split_first()?;
    let node = evidence.node(*first);
    let touch = evidence.wiring.touching.at(*first).first()?;
    let pin = evidence.circuit.pins(touch.element).get(touch.pin as usize)?;
    let leads: Vec<String> = cut.leads.iter().map(|&id| evidence.name(id)).collect();
    let message = match rest {
        [] => format!("nothing holds the direct voltage of node `{node}`: only {} touch it", list(&leads)),
        _ => format!(
            "nothing holds the direct voltage of node `{node}` and of {} joined to it: only {} lead out",
            super::count(rest.len(), "node"),
            list(&leads)
        ),
    };
    let message = if leads.len() == 1 { singular(message) } else { message };
    let scope = evidence.circuit.element(touch.element).scope;
    let mut finding = evidence
        .at(&RULE, scope, pin.span, message)
        .label("no direct-current path from here to ground")
        .about(node)
        .help(format!("{} {}", RULE.why, RULE.remedy));
    for &id in cut.leads.iter().filter(|&&id| id != touch.element).take(MOST_LABELS) {
        finding = finding.also(evidence.statement(id), lead(evidence, id));
    }
    finding.subjects.extend(leads);
    Some(finding)
}

const MOST_LABELS: usize = 4;

fn singular(message: String) -> String {
    message.replace(" touch it", " touches it").replace(" lead out", " leads out")
}

fn lead(evidence: &Evidence<'_>, id: ElementId) -> &'static str {
    match evidence.circuit.element(id).letter {
        b'C' => "a capacitor passes no direct current",
        b'M' => "a gate passes no direct current",
        b'I' => "a current source holds no voltage",
        _ => "an input that only listens",
    }
}
