//! An `accept` note that silences nothing.

use super::{Check, Evidence, Group, Rule, find};
use crate::circuit::Note;
use crate::finding::{Finding, Severity};

pub const RULE: Rule = Rule {
    name: "idle-accept",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "an `accept` note silences nothing",
    why: "The finding it stood for is gone, or a name in it is wrong. Left standing it would hide the same \
          finding when it comes back for another reason.",
    remedy: "Take the note out, or correct the name of the rule or of what it is about.",
    source: None,
    failing: "tide gauge buoy: float switch\n\
              VCC vcc 0 3.3\n\
              R1 vcc in 10k\n\
              R2 in 0 100k\n\
              *@ accept dangling-node tp1 because it is a test pad\n",
    passing: "tide gauge buoy: float switch\n\
              VCC vcc 0 3.3\n\
              R1 vcc in 10k\n\
              R2 in 0 100k\n",
    check: Check::Notes,
};

/// The finding about such a note.
pub fn finding(evidence: &Evidence<'_>, note: &Note, rule: &str) -> Finding {
    let subject = evidence.circuit.text(note.subject);
    let message = match (find(rule), subject) {
        (None, _) => format!("this note accepts `{rule}`, which is no rule"),
        (Some(_), "") => format!("this note accepts {rule}, but there is no such finding"),
        (Some(_), _) => format!("this note accepts {rule} for {subject}, but there is no such finding"),
    };
    super::support::about_note(evidence, RULE.name, note, message)
        .label("silences nothing")
        .help(format!("{} {}", RULE.why, RULE.remedy))
}
