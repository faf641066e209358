//! A watched node that ripples more than its note allows.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::directory::Directory;
use crate::circuit::{NodeId, Note, NoteKind};
use crate::finding::{Finding, Severity, quantity};
use crate::operating::Operating;
use crate::swing::Swing;

pub const RULE: Rule = Rule {
    name: "ripple-beyond-limit",
    group: Group::Time,
    severity: Severity::Warning,
    also: None,
    summary: "a watched node ripples more than its note allows",
    why: "What hangs on the node sees the whole ripple: a regulator drops out in its valleys, a measurement follows \
          its crests.",
    remedy: "Take a larger reservoir capacitor (the ripple falls in proportion), rectify both half-waves, or draw \
             less.",
    source: Some(
        "Ripple of a reservoir V = I/(f·C): A. S. Sedra, K. C. Smith, Microelectronic Circuits, section on the \
         peak rectifier",
    ),
    failing: "tide gauge buoy: bench supply with too small a reservoir\n\
              V1 ac 0 SIN(0 17 50)\n\
              D1 ac raw DRECT\n\
              C1 raw 0 470u\n\
              RLOAD raw 0 150\n\
              .model DRECT D(RS=50m)\n\
              *@ watch raw ripple < 1.5\n",
    passing: "tide gauge buoy: bench supply\n\
              V1 ac 0 SIN(0 17 50)\n\
              D1 ac raw DRECT\n\
              C1 raw 0 2200u\n\
              RLOAD raw 0 150\n\
              .model DRECT D(RS=50m)\n\
              *@ watch raw ripple < 1.5\n",
    check: Check::Time(check),
};

fn check(evidence: &Evidence<'_>, _operating: &Operating, swing: &Swing) -> Vec<Finding> {
    let limited = |note: &&Note| matches!(note.kind, NoteKind::Watch { ripple: Some(_), .. });
    let notes: Vec<&Note> = evidence.circuit.notes.iter().filter(limited).collect();
    if notes.is_empty() || swing.span.is_none() {
        return Vec::new();
    }
    let directory = Directory::of(evidence.circuit);
    notes.iter().filter_map(|note| judge(evidence, &directory, swing, note)).collect()
}

fn judge(evidence: &Evidence<'_>, directory: &Directory<'_>, swing: &Swing, note: &Note) -> Option<Finding> {
    let NoteKind::Watch { other, ripple: Some(limit) } = &note.kind else { return None };
    if other.is_some() {
        return None; // the difference of two nodes has no figures of its own
    }
    let node: NodeId = directory.node(note.scope, evidence.circuit.text(note.subject))?;
    let level = swing.node(node)?.over_time?;
    if level.ripple() <= limit.number {
        return None;
    }
    let message = format!(
        "`{}` ripples by {} peak to peak, from {} to {}; its note allows {}",
        evidence.node(node),
        quantity(level.ripple(), "V"),
        quantity(level.min, "V"),
        quantity(level.max, "V"),
        quantity(limit.number, "V")
    );
    Some(
        evidence
            .at(&RULE, note.scope, note.span, message)
            .label("the limit that is set here")
            .about(evidence.node(node))
            .help(format!("{} {}", RULE.why, RULE.remedy)),
    )
}
