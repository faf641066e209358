//! An inductor whose current has nowhere to go when the switch in its way opens.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, ElementId, Hold, NodeId, NoteKind};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;
use crate::topology::Ways;
use rustc_hash::{FxHashMap, FxHashSet};

pub const RULE: Rule = Rule {
    name: "no-freewheel-path",
    group: Group::Time,
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
    let circuit = evidence.circuit;
    let mut switches: Vec<ElementId> = switches(evidence).into_iter().collect();
    if switches.is_empty() {
        return Vec::new();
    }
    switches.sort();
    let open: FxHashSet<ElementId> = switches.iter().copied().collect();
    let ways = [&open, &FxHashSet::default()].map(|open| Ways::of(circuit, &evidence.wiring.noted, open));
    let mut near: FxHashMap<NodeId, ElementId> = FxHashMap::default();
    for &switch in &switches {
        let (p, q) = crate::operating::main_path(circuit, switch);
        for node in [p, q] {
            near.entry(node).or_insert(switch);
        }
    }
    let coils = circuit.elements().filter(|(id, e)| {
        matches!(&e.behaviour, Behaviour::Inductor { henries, .. } if henries.number > 0.0)
            && !evidence.is_coupled(*id)
    });
    let mut findings = Vec::new();
    for (coil, _) in coils.filter(|(id, _)| is_cut_off(&ways, *id)) {
        let ends = [circuit.node(coil, 0), circuit.node(coil, 1)];
        let beside = ends.iter().filter_map(|n| near.get(n).copied()).min();
        if let Some(switch) = beside.or(switches.first().copied()) {
            findings.push(tell(evidence, swing, coil, ends, switch));
        }
    }
    findings
}

/// A closed path leads through the coil with all switches closed, and none with them open.
fn is_cut_off([open, closed]: &[Ways; 2], coil: ElementId) -> bool {
    // a coil that never carries anything is for other rules to tell
    !open.closes(coil) && closed.closes(coil)
}

/// Switches that follow a control, and transistors and switches that a note holds on and off.
fn switches(evidence: &Evidence<'_>) -> FxHashSet<ElementId> {
    let circuit = evidence.circuit;
    let mut found: FxHashSet<ElementId> = FxHashSet::default();
    let mut held: FxHashSet<ElementId> = FxHashSet::default();
    let holds = || circuit.notes.iter().filter(|note| matches!(note.kind, NoteKind::Hold(_)));
    let directory = holds().next().map(|_| Directory::of(circuit));
    for note in holds() {
        let subject = circuit.text(note.subject);
        let Some(id) = directory.as_ref().and_then(|d| d.element(note.scope, subject)) else { continue };
        held.insert(id);
        if matches!(note.kind, NoteKind::Hold(Hold::Both)) {
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

fn tell(
    evidence: &Evidence<'_>,
    swing: &Swing,
    coil: ElementId,
    ends: [NodeId; 2],
    switch: ElementId,
) -> Finding {
    let name = evidence.name(coil);
    let peak =
        ends.into_iter().filter_map(|n| swing.node(n)?.over_time).map(|l| l.max.abs().max(l.min.abs()));
    let reached = match peak.fold(0.0, f64::max) {
        volts if volts > 0.0 => format!("; its end reaches {} in this model", quantity(volts, "V")),
        _ => String::new(),
    };
    let message =
        format!("when {} opens, the current of {name} has no path left{reached}", evidence.name(switch));
    let finding = evidence.about(&RULE, coil, message).label("its current cannot stop at once");
    let finding =
        finding.also(evidence.statement(switch), "opens its only path").about(evidence.name(switch));
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
