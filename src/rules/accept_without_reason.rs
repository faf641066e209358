//! An `accept` note that does not say why.

use super::{Check, Evidence, Group, Rule};
use crate::circuit::Note;
use crate::finding::{Finding, Severity};

pub const RULE: Rule = Rule {
    name: "accept-without-reason",
    group: Group::Notes,
    severity: Severity::Warning,
    also: None,
    summary: "an `accept` note gives no reason, so it silences nothing",
    why: "Whoever reads the circuit next must know whether the finding was looked at or only switched off.",
    remedy: "Say why: `*@ accept RULE NAME because …`.",
    source: None,
    failing: "tide gauge buoy: float switch\n\
              VCC vcc 0 3.3\n\
              R1 vcc in 10k\n\
              R2 in 0 100k\n\
              *@ accept parallel-diodes D1\n",
    passing: "tide gauge buoy: float switch\n\
              VCC vcc 0 3.3\n\
              R1 vcc in 10k\n\
              R2 in 0 100k\n",
    check: Check::Notes,
};

/// The finding about such a note.
pub fn finding(evidence: &Evidence<'_>, note: &Note, rule: &str) -> Finding {
    super::support::about_note(
        evidence,
        RULE.name,
        note,
        format!("this note accepts {rule} without a reason"),
    )
    .label("no `because …`")
    .help(format!("{} {}", RULE.why, RULE.remedy))
}
