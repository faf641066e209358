//! The edit that turns a diode round.

use super::Evidence;
use crate::circuit::ElementId;
use crate::finding::{Edit, Finding};

/// Adds the edit that swaps the diode's two node names.
pub fn turn_round(evidence: &Evidence<'_>, id: ElementId, finding: Finding) -> Finding {
    let [anode, cathode, ..] = evidence.circuit.pins(id) else { return finding };
    let (one, two) = (evidence.sources.slice(anode.span), evidence.sources.slice(cathode.span));
    if one.is_empty() || two.is_empty() {
        return finding;
    }
    let edits = vec![
        Edit { span: anode.span, replacement: two.to_owned() },
        Edit { span: cathode.span, replacement: one.to_owned() },
    ];
    finding.fix(format!("turn {} round", evidence.name(id)), edits)
}
