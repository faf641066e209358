//! An inductor whose current has nowhere to go when the switch in its way opens.

use super::{Check, Evidence, Rule};
use crate::circuit::{Behaviour, ElementId, NodeId, NoteKind};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;
use rustc_hash::FxHashSet;

pub const RULE: Rule = Rule {
    name: "no-freewheel-path",
    group: "time",
    severity: Severity::Warning,
    also: None,
    summary: "an inductor is switched off and its current has no other path",
    why: "The current of an inductor cannot stop at once: when the switch opens, the voltage rises until something \
          gives way, usually the switch.",
    remedy: "Put a diode across the coil, its cathode to the positive end, or across the switch a part that may break \
             down or a resistor with a capacitor.",
    source: Some("The current of an inductance is continuous: v = L·di/dt, any text on circuits"),
    failing: "tide gauge buoy: latch relay without its freewheel diode\n\
              VBUS bus 0 12\n\
              RCOIL bus coil 180\n\
              LCOIL coil sw 95m\n\
              S1 sw 0 ctl 0 SWR\n\
              VCTL ctl 0 PULSE(0 5 1m 10u 10u 4m 10m)\n\
              .model SWR SW(VT=2.5 RON=0.5 ROFF=10meg)\n",
    passing: "tide gauge buoy: latch relay with its freewheel diode\n\
              VBUS bus 0 12\n\
              RCOIL bus coil 180\n\
              LCOIL coil sw 95m\n\
              D1 sw bus DFW\n\
              S1 sw 0 ctl 0 SWR\n\
              VCTL ctl 0 PULSE(0 5 1m 10u 10u 4m 10m)\n\
              .model SWR SW(VT=2.5 RON=0.5 ROFF=10meg)\n\
              .model DFW D(RS=50m)\n",
    check: Check::Time(check),
};

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let switches = switches(evidence);
    if switches.is_empty() {
        return Vec::new();
    }
    let coupled: FxHashSet<ElementId> =
        crate::topology::coupled_coils(evidence.circuit).into_iter().collect();
    let coils = evidence.circuit.elements().filter(|(id, e)| {
        matches!(&e.behaviour, Behaviour::Inductor { henries, .. } if henries.number > 0.0)
            && !coupled.contains(id)
    });
    coils.filter_map(|(id, _)| judge(evidence, swing, id, &switches)).collect()
}

/// Switches that follow a control, and transistors and switches that a note holds on and off.
fn switches(evidence: &Evidence<'_>) -> FxHashSet<ElementId> {
    let circuit = evidence.circuit;
    let mut found: FxHashSet<ElementId> = FxHashSet::default();
    let mut held: FxHashSet<ElementId> = FxHashSet::default();
    let directory = crate::circuit::directory::Directory::of(circuit);
    for note in &circuit.notes {
        let NoteKind::Hold(how) = note.kind else { continue };
        let Some(id) = directory.element(note.scope, circuit.text(note.subject)) else { continue };
        held.insert(id);
        if how == crate::circuit::Hold::Both {
            found.insert(id);
        }
    }
    let follows =
        |b: &Behaviour| matches!(b, Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. });
    found.extend(
        circuit.elements().filter(|(id, e)| follows(&e.behaviour) && !held.contains(id)).map(|(id, _)| id),
    );
    found
}

/// Walks on both sides of the coil with all switches open: does a closed path lead through it, and does one with them
/// closed?
fn judge(
    evidence: &Evidence<'_>,
    swing: &Swing,
    coil: ElementId,
    switches: &FxHashSet<ElementId>,
) -> Option<Finding> {
    let (a, b) = (evidence.circuit.node(coil, 0), evidence.circuit.node(coil, 1));
    let none = FxHashSet::default();
    let reaches = |from, to, open: &FxHashSet<ElementId>| reaches(evidence, from, to, coil, open);
    if a == b || reaches(a, b, switches) || reaches(b, a, switches) {
        return None;
    }
    if !(reaches(a, b, &none) || reaches(b, a, &none)) {
        return None; // it never carries anything; other rules tell that
    }
    let mut near: Vec<ElementId> =
        switches.iter().copied().filter(|&s| touches_way(evidence, s, a, b, coil)).collect();
    near.sort();
    let switch = near.first().copied().or_else(|| switches.iter().min().copied())?;
    let name = evidence.name(coil);
    let peak =
        [a, b].into_iter().filter_map(|n| swing.node(n)?.over_time).map(|l| l.max.abs().max(l.min.abs()));
    let reached = match peak.fold(0.0, f64::max) {
        volts if volts > 0.0 => format!("; its end reaches {} in this model", quantity(volts, "V")),
        _ => String::new(),
    };
    let message =
        format!("when {} opens, the current of {name} has no path left{reached}", evidence.name(switch));
    let finding = evidence.about(&RULE, coil, message).label("its current cannot stop at once");
    let finding =
        finding.also(evidence.statement(switch), "opens its only path").about(evidence.name(switch));
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}

/// Whether a switch stands at an end of the coil.
fn touches_way(evidence: &Evidence<'_>, switch: ElementId, a: NodeId, b: NodeId, coil: ElementId) -> bool {
    let (p, q) = crate::operating::main_path(evidence.circuit, switch);
    switch != coil && [p, q].iter().any(|n| *n == a || *n == b)
}

/// Whether a current may flow from one node to another past the coil; diodes pass it one way.
fn reaches(
    evidence: &Evidence<'_>,
    from: NodeId,
    to: NodeId,
    coil: ElementId,
    open: &FxHashSet<ElementId>,
) -> bool {
    let mut seen: FxHashSet<NodeId> = FxHashSet::default();
    let mut rest = vec![from];
    while let Some(node) = rest.pop() {
        if node == to {
            return true;
        }
        if !seen.insert(node) {
            continue;
        }
        // supplied nodes lead to ground
        if node != NodeId::GROUND && evidence.wiring.noted.is_supplied(node) {
            rest.push(NodeId::GROUND);
        }
        if node == NodeId::GROUND {
            rest.extend(&evidence.wiring.noted.supplied);
        }
        for touch in evidence.wiring.touching.at(node) {
            let id = touch.element;
            if id != coil && !open.contains(&id) {
                rest.extend(onward(evidence, id, node));
            }
        }
    }
    false
}

/// Nodes that a current reaches through an element from one of its nodes.
fn onward(evidence: &Evidence<'_>, id: ElementId, node: NodeId) -> Vec<NodeId> {
    let circuit = evidence.circuit;
    let others = || circuit.pins(id).iter().map(|p| p.node).filter(|n| *n != node).collect::<Vec<_>>();
    match &circuit.element(id).behaviour {
        Behaviour::Diode { model, .. } => {
            let breaks = model.is_some_and(|m| circuit.model(m).parameter("bv").is_some());
            if breaks || circuit.node(id, 0) == node { others() } else { Vec::new() }
        }
        Behaviour::CurrentSource(_) | Behaviour::Coupling { .. } => Vec::new(),
        Behaviour::VoltageByVoltage { .. }
        | Behaviour::CurrentByVoltage { .. }
        | Behaviour::VoltageSwitch { .. } => {
            let (p, q) = (circuit.node(id, 0), circuit.node(id, 1));
            [(p, q), (q, p)].into_iter().filter(|(x, _)| *x == node).map(|(_, y)| y).collect()
        }
        // what is not known may lead anywhere
        _ => others(),
    }
}
