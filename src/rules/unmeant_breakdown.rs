//! A diode that breaks down where nobody meant it to.

use super::{Check, Evidence, Group, Rule, in_cases};
use crate::circuit::{ElementId, NoteKind, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "unmeant-breakdown",
    group: Group::States,
    severity: Severity::Warning,
    also: None,
    summary: "a rectifier, signal diode or LED is driven into reverse breakdown",
    why: "The breakdown voltage of such a diode is a limit, not a working point: what it dissipates there soon destroys \
          it.",
    remedy: "Take a diode of a higher reverse voltage, turn it round, or limit the voltage. If it is meant to break down, \
             say so: `*@ expect NAME breakdown`.",
    source: None,
    failing: "tide gauge buoy: indicator across a long cable\n\
              VLINE line 0 -24\n\
              R1 line lamp 1k\n\
              R2 lamp 0 10k\n\
              D1 lamp 0 DGREEN\n\
              .model DGREEN D(IS=1e-20 N=2 BV=5)\n",
    passing: "tide gauge buoy: indicator across a long cable\n\
              VLINE line 0 24\n\
              R1 line lamp 1k\n\
              R2 lamp 0 10k\n\
              D1 lamp 0 DGREEN\n\
              .model DGREEN D(IS=1e-20 N=2 BV=5)\n",
    check: Check::States(check),
};

/// From here on a breakdown voltage is a rectifier's.
const RECTIFIER: f64 = 50.0;
/// Schottky and germanium junctions drop less.
const SILICON: f64 = 0.35;

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut broken: BTreeMap<ElementId, (f64, Vec<usize>)> = BTreeMap::new();
    for (number, case) in operating.cases.iter().enumerate() {
        for diode in case.solutions.first().into_iter().flat_map(|s| &s.diodes) {
            let Some(bv) = diode.breakdown.filter(|_| diode.state == State::Breakdown) else { continue };
            let drop = diode.drop.volts;
            let is_limit = bv >= RECTIFIER || drop >= 1.2 || (0.1..SILICON).contains(&drop);
            if is_limit && !is_meant(evidence, diode.element) {
                let entry = broken.entry(diode.element).or_insert((0.0, Vec::new()));
                entry.0 = entry.0.max(diode.current.known().map_or(0.0, f64::abs));
                entry.1.push(number);
            }
        }
    }
    let tell = |(&id, (current, cases)): (&ElementId, &(f64, Vec<usize>))| {
        let seen = evidence.standing(operating).diode(id);
        let volts = seen.and_then(|s| s.breakdown).unwrap_or(0.0);
        let message = format!(
            "{} breaks down at {} and carries {} backwards{}",
            evidence.name(id),
            quantity(volts, "V"),
            quantity(*current, "A"),
            in_cases(operating, cases)
        );
        let mut finding = evidence.about(&RULE, id, message).label("beyond its reverse voltage");
        for pin in [0, 1] {
            let end = super::behind(evidence, id, pin).end;
            if let Some(source) = evidence.wiring.rails.source(end) {
                finding.subjects.extend([evidence.name(source), evidence.node(end)]);
            }
        }
        evidence.name_nodes(&mut finding, &[id]);
        // a current source drives on whatever stands in its way
        let ends = evidence.circuit.pins(id).iter().map(|p| p.node).collect::<Vec<_>>();
        let drivers = ends.iter().flat_map(|&n| evidence.wiring.touching.at(n)).filter(|t| {
            matches!(
                evidence.circuit.element(t.element).behaviour,
                crate::circuit::Behaviour::CurrentSource(_)
            )
        });
        finding.subjects.extend(drivers.map(|t| evidence.name(t.element)).collect::<Vec<_>>());
        finding.help(format!("{} {}", RULE.why, RULE.remedy))
    };
    broken.iter().map(tell).collect()
}

/// A note expects it.
fn is_meant(evidence: &Evidence<'_>, id: ElementId) -> bool {
    let circuit = evidence.circuit;
    let name = evidence.name(id);
    circuit.notes.iter().any(|note| match &note.kind {
        NoteKind::Expect(e) if e.state == Some(State::Breakdown) => {
            let subject = circuit.text(note.subject);
            name.eq_ignore_ascii_case(subject)
                || name.rsplit(':').next().is_some_and(|own| own.eq_ignore_ascii_case(subject))
                || evidence.model_name(id).is_some_and(|m| m.eq_ignore_ascii_case(subject))
        }
        _ => false,
    })
}
