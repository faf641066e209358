//! Closed loops of voltage sources, alone or with inductors and 0 Ω.

use super::{Check, Evidence, Group, Rule, list};
use crate::circuit::{Behaviour, ElementId, Source};
use crate::finding::{Finding, Severity, quantity};
use crate::topology::{Loop, Sum};

pub const RULE: Rule = Rule {
    name: "source-loop",
    group: Group::Wiring,
    severity: Severity::Error,
    also: Some(Severity::Warning),
    summary: "voltage sources form a closed loop without resistance",
    why: "Around a loop the voltages must sum to zero. Where they do not, no current satisfies the sources (or, \
          through an inductor, it grows without limit); where they do, nothing tells how the sources share it.",
    remedy: "Take one source out of the loop, or put the resistance in that the real parts have.",
    source: Some(
        "Loops of voltage sources only must be excluded: Chua, Desoer & Kuh, Linear and Nonlinear \
                  Circuits, McGraw-Hill 1987",
    ),
    failing: "tide gauge buoy: two batteries on one rail\n\
              VBAT1 rail 0 12.6\n\
              VBAT2 rail 0 12.1\n\
              RLOAD rail 0 47\n",
    passing: "tide gauge buoy: two batteries on one rail\n\
              VBAT1 b1 0 12.6\n\
              VBAT2 b2 0 12.1\n\
              RINT1 b1 rail 0.1\n\
              RINT2 b2 rail 0.1\n\
              RLOAD rail 0 47\n",
    check: Check::Wiring(check),
};

/// What takes part in a loop.
#[derive(Default)]
struct Parts {
    sources: Vec<ElementId>,
    controlled: bool,
    inductor: bool,
    short: bool,
    /// A source moves and has no DC value.
    moving: bool,
    /// A source that is not an ammeter of 0 V.
    live: bool,
}

fn check(evidence: &Evidence<'_>) -> Vec<Finding> {
    evidence.wiring.loops.iter().filter_map(|l| judge(evidence, l)).collect()
}

fn parts(evidence: &Evidence<'_>, walk: &Loop) -> Parts {
    let mut parts = Parts::default();
    for step in &walk.steps {
        match &evidence.circuit.element(step.element).behaviour {
            Behaviour::VoltageSource(source) => {
                parts.sources.push(step.element);
                parts.moving |= source.dc.is_none() && source.shape.is_some();
                parts.live |= !is_ammeter(source);
            }
            Behaviour::Inductor { .. } => parts.inductor = true,
            Behaviour::Resistor(_) => parts.short = true,
            _ => {
                parts.sources.push(step.element);
                parts.controlled = true;
                parts.live = true;
            }
        }
    }
    parts
}

/// The same name twice in one loop: a line that stands twice, which has a finding of its own.
fn is_twice(evidence: &Evidence<'_>, walk: &Loop) -> bool {
    let first = evidence.name(walk.steps[0].element);
    walk.steps.iter().skip(1).any(|step| evidence.name(step.element).eq_ignore_ascii_case(&first))
}

fn is_ammeter(source: &Source) -> bool {
    source.shape.is_none() && source.dc.is_none_or(|v| v.number == 0.0)
}

fn judge(evidence: &Evidence<'_>, walk: &Loop) -> Option<Finding> {
    let parts = parts(evidence, walk);
    if is_twice(evidence, walk) {
        return None;
    }
    let names: Vec<String> = walk.steps.iter().map(|s| evidence.name(s.element)).collect();
    let all = list(&names);
    let (severity, message) = match walk.sum {
        // what moves drives its inductor as it should; the states judge a direct part of it
        _ if parts.inductor && (parts.moving || parts.controlled) => return None,
        Sum::Volts(volts) if parts.inductor => (
            Severity::Error,
            format!(
                "{all} form a loop without resistance with {} left over: its direct current grows without limit",
                quantity(volts.abs(), "V")
            ),
        ),
        Sum::Volts(volts) if parts.sources.len() == 1 => (
            Severity::Error,
            format!(
                "{} is shorted by 0 Ω: {all} form a loop with {} left over",
                evidence.name(*parts.sources.first()?),
                quantity(volts.abs(), "V")
            ),
        ),
        Sum::Volts(volts) => (
            Severity::Error,
            format!(
                "{all} contradict one another: their voltages around the loop leave {} over",
                quantity(volts.abs(), "V")
            ),
        ),
        Sum::Zero if !parts.live || parts.inductor => return None,
        Sum::Zero | Sum::Unknown => (
            Severity::Warning,
            format!("{all} form a loop without resistance: nothing tells what current flows around it"),
        ),
    };
    let (first, others) = walk.steps.split_first()?;
    let mut finding = evidence.about(&RULE, first.element, message).label("closes the loop");
    finding.severity = severity;
    for step in others.iter().take(8) {
        finding = finding.also(evidence.statement(step.element), "in the same loop");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    let elements: Vec<ElementId> = walk.steps.iter().map(|s| s.element).collect();
    evidence.name_nodes(&mut finding, &elements);
    Some(finding.help(format!("{} {}", RULE.why, RULE.remedy)))
}
