//! Diodes of one kind in parallel, pointing the same way, without a resistance of their own.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, ModelId, NodeId, NoteKind};
use crate::finding::{Finding, Severity};
use crate::operating::thermal_voltage;

pub const RULE: Rule = Rule {
    name: "parallel-diodes",
    group: Group::Orientation,
    severity: Severity::Note,
    also: None,
    summary: "diodes of one model share a current with nothing that makes them share it evenly",
    why: "10 mV between two forward voltages parts the currents by nearly 1.5 to 1, 60 mV by ten to one, and \
          the diode that takes more grows warmer and takes more still.",
    remedy: "Give each its own series resistance (its drop well above the spread of the forward voltages), or \
             use one diode of the full rating. If they are a matched pair, say so: `*@ matched D1 D2`.",
    source: Some(
        "Ratio exp(dV/(n kT/q)) of the exponential law; a published pair of one type shares 10 A as \
                  6.7 A and 3.3 A: ST application note AN4381",
    ),
    failing: "tide gauge buoy: mooring light\n\
              VBAT bat 0 12\n\
              R1 bat lamps 220\n\
              D1 lamps 0 DWHITE\n\
              D2 lamps 0 DWHITE\n\
              .model DWHITE D(IS=1e-26 N=2)\n",
    passing: "tide gauge buoy: mooring light\n\
              VBAT bat 0 12\n\
              R1 bat lamp1 470\n\
              R2 bat lamp2 470\n\
              D1 lamp1 0 DWHITE\n\
              D2 lamp2 0 DWHITE\n\
              .model DWHITE D(IS=1e-26 N=2)\n",
    check: Check::Wiring(check),
};

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    let mut diodes: Vec<(NodeId, NodeId, ModelId, ElementId)> = Vec::new();
    for (id, element) in evidence.circuit.elements() {
        if let Behaviour::Diode { model: Some(model), .. } = element.behaviour {
            let (anode, cathode) = (evidence.circuit.node(id, 0), evidence.circuit.node(id, 1));
            if anode != cathode {
                diodes.push((anode, cathode, model, id));
            }
        }
    }
    diodes.sort_unstable();
    let same = |a: &(NodeId, NodeId, ModelId, ElementId), b: &(NodeId, NodeId, ModelId, ElementId)| {
        (a.0, a.1, a.2) == (b.0, b.1, b.2)
    };
    let groups = diodes.chunk_by(same).filter(|group| group.len() > 1);
    let mut groups: Vec<Vec<ElementId>> =
        groups.map(|group| group.iter().map(|diode| diode.3).collect()).collect();
    groups.sort();
    groups.iter().filter(|diodes| !is_matched(evidence, diodes)).map(|d| judge(evidence, d)).collect()
}

fn judge(evidence: &Evidence<'_>, diodes: &[ElementId]) -> Finding {
    let names: Vec<String> = diodes.iter().map(|&id| evidence.name(id)).collect();
    let (anode, cathode) = (evidence.circuit.node(diodes[0], 0), evidence.circuit.node(diodes[0], 1));
    let message = format!(
        "{} lie in parallel from `{}` to `{}` with nothing that makes them share the current evenly: {}",
        list(&names),
        evidence.node(anode),
        evidence.node(cathode),
        shares(evidence, diodes)
    );
    let mut finding = evidence.about(&RULE, diodes[0], message).label("shares its current with");
    for (&id, name) in diodes.iter().zip(&names).skip(1).take(8) {
        finding = finding.also(evidence.statement(id), format!("{name}, of the same model"));
    }
    finding.subjects.extend(names.into_iter().skip(1));
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}

/// What two of them would carry with forward voltages a little apart.
fn shares(evidence: &Evidence<'_>, diodes: &[ElementId]) -> String {
    let circuit = evidence.circuit;
    let model = diodes.first().and_then(|&id| match circuit.element(id).behaviour {
        Behaviour::Diode { model, .. } => model,
        _ => None,
    });
    let emission = model.and_then(|m| circuit.model(m).parameter("n")).map_or(1.0, |v| v.number.max(0.1));
    let slope = emission * thermal_voltage(27.0);
    let share = |apart: f64| 100.0 / (1.0 + (-apart / slope).exp());
    let parts: Vec<String> =
        [10e-3, 30e-3, 60e-3].map(|v| format!("{:.0} : {:.0}", share(v), 100.0 - share(v))).to_vec();
    format!("10, 30 or 60 mV apart, two of them part a current {}", parts.join(", "))
}

/// A note says that one of them belongs to a matched set.
fn is_matched(evidence: &Evidence<'_>, diodes: &[ElementId]) -> bool {
    let circuit = evidence.circuit;
    circuit.notes.iter().any(|note| {
        let NoteKind::Matched(others) = &note.kind else { return false };
        let mut named = others.iter().chain([&note.subject]).map(|&s| circuit.text(s));
        named.any(|name| {
            diodes.iter().any(|&id| {
                circuit.text(circuit.element(id).name).eq_ignore_ascii_case(name)
                    || evidence.name(id).eq_ignore_ascii_case(name)
            })
        })
    })
}
