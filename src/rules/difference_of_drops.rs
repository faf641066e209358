//! Voltages that come from drops that cancel: this model cannot tell them.

use super::support::{by_diode, in_case};
use super::{Check, Evidence, Group, Rule};
use crate::circuit::{NodeId, NoteKind, ScopeId, State};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::{DifferenceOf, DifferenceResult, Operating};

pub const RULE: Rule = Rule {
    name: "difference-of-drops",
    group: Group::Trust,
    severity: Severity::Note,
    also: Some(Severity::Warning),
    summary: "a voltage that matters is little more than a difference of drops",
    why: "One drop a diode says nothing about how two drops differ: that follows from the ratio of their currents, about 60 mV a decade (times N), and from their temperatures.",
    remedy: "Take this voltage from the exponential law, and the currents from here.",
    source: Some(
        "dV = N kT/q ln(I1/I2), the principle of junction thermometers: Maxim application note 1057",
    ),
    failing: "tide gauge buoy: thermometer of the water sensor\n\
              *@ watch a b\n\
              I1 0 a 100u\n\
              I2 0 b 50u\n\
              D1 a 0 DT\n\
              D2 b 0 DT\n\
              .model DT D(IS=1e-14)\n",
    passing: "tide gauge buoy: level of the water sensor\n\
              *@ watch a b\n\
              V1 p 0 5\n\
              R1 p a 1k\n\
              R2 a 0 1k\n\
              R3 p b 3k\n\
              R4 b 0 1k\n\
              D1 b 0 DT\n\
              .model DT D(IS=1e-14)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut known: Vec<(DifferenceOf, NodeId, NodeId)> = Vec::new();
    let mut findings = Vec::new();
    for (number, case) in operating.cases.iter().enumerate() {
        let [solution] = &case.solutions[..] else { continue };
        for difference in solution.differences.iter().filter(|d| is_outside(d)) {
            let key = (difference.of, difference.from, difference.to);
            if !known.contains(&key) {
                known.push(key);
                findings.push(finding(evidence, operating, number, difference));
            }
        }
    }
    findings.extend(matched(evidence, operating));
    findings
}

/// The drops are known no better than half of it, and by more than one scatter.
fn is_outside(difference: &DifferenceResult) -> bool {
    difference.error >= 5e-3 && difference.error >= 0.5 * difference.voltage.abs()
}

/// Volts by which the two opinions may differ and still say one thing.
const ALIKE: f64 = 2e-3;

/// Whoever reads the voltage that the drops give is misled. Where the exponential law gives the same, as for matched
/// diodes at equal currents, the doubt is only worth knowing.
fn is_misled(by_drops: f64, refined: Option<f64>) -> bool {
    refined.is_none_or(|v| (v - by_drops).abs() > ALIKE)
}

fn finding(evidence: &Evidence<'_>, operating: &Operating, number: usize, d: &DifferenceResult) -> Finding {
    let between = match (d.from, d.to) {
        (from, NodeId::GROUND) => format!("v({})", evidence.node(from)),
        (from, to) => format!("v({}) - v({})", evidence.node(from), evidence.node(to)),
    };
    let (role, place) = match d.of {
        DifferenceOf::Watched => ("which a note watches", None),
        DifferenceOf::Control(id) => ("which a source listens to", Some(id)),
        DifferenceOf::Resistor(id) => ("which drives a resistor between two diodes", Some(id)),
    };
    let exact =
        d.refined.map_or(String::new(), |v| format!("; by the exponential law it is {}", quantity(v, "V")));
    let message = format!(
        "{between}, {role}, is {} ± {} by the drops of its diodes{exact}{}",
        quantity(d.voltage, "V"),
        quantity(d.error, "V"),
        in_case(operating, number)
    );
    let mut finding = match place {
        Some(id) => evidence.about(&RULE, id, message),
        None => {
            let note = evidence.circuit.notes.iter().find(|n| {
                let name = evidence.circuit.text(n.subject);
                matches!(n.kind, NoteKind::Watch { .. }) && evidence.node(d.from).eq_ignore_ascii_case(name)
            });
            let span = note.map_or(crate::text::Span::new(crate::text::FileId(0), 0, 0), |n| n.span);
            let scope = note.map_or(ScopeId::ROOT, |n| n.scope);
            evidence.at(&RULE, scope, span, message).about(evidence.node(d.from))
        }
    };
    if d.of == DifferenceOf::Watched && is_misled(d.voltage, d.refined) {
        finding.severity = Severity::Warning;
    }
    finding.label("a difference of drops").help(format!("{} {}", RULE.why, RULE.remedy))
}

/// Matched diodes that both conduct, not side by side.
fn matched(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let circuit = evidence.circuit;
    let diodes = by_diode(operating);
    let mut findings = Vec::new();
    for note in &circuit.notes {
        let NoteKind::Matched(others) = &note.kind else { continue };
        let named = |name: &str| diodes.iter().find(|(id, _)| evidence.name(*id).eq_ignore_ascii_case(name));
        let Some((first, here)) = named(circuit.text(note.subject)) else { continue };
        for (second, there) in others.iter().filter_map(|&s| named(circuit.text(s))) {
            let both = here
                .iter()
                .zip(there)
                .find(|(a, b)| a.1.state == State::Conducting && b.1.state == State::Conducting);
            let beside = (0..2).all(|pin| circuit.node(*first, pin) == circuit.node(*second, pin));
            let Some((&(number, a), &(_, b))) = both.filter(|_| !beside) else { continue };
            let (Some(va), Some(vb)) = (a.voltage.known(), b.voltage.known()) else { continue };
            let error = a.knee.map_or(0.0, |k| k.uncertainty) + b.knee.map_or(0.0, |k| k.uncertainty);
            if error < 5e-3 || error < 0.5 * (va - vb).abs() {
                continue;
            }
            let refined = a.refined.zip(b.refined).map(|(a, b)| a.voltage - b.voltage);
            let exact = refined
                .map_or(String::new(), |v| format!("; by the exponential law it is {}", quantity(v, "V")));
            let message = format!(
                "the matched {} and {} differ by {} ± {} by their drops{exact}{}",
                evidence.name(*first),
                evidence.name(*second),
                quantity(va - vb, "V"),
                quantity(error, "V"),
                in_case(operating, number)
            );
            let mut finding = evidence.about(&RULE, *first, message).about(evidence.name(*second));
            if is_misled(va - vb, refined) {
                finding.severity = Severity::Warning;
            }
            finding = finding.label("matched").also(evidence.statement(*second), "with this one");
            findings.push(finding.help(format!("{} {}", RULE.why, RULE.remedy)));
        }
    }
    findings
}
