//! Puts the comparison together, condition by condition.

use super::cases::{Twin, Twins, current, seen, twins};
use super::matching::Pairs;
use super::outcome::{Comparison, StateChange, TrustChange, VerdictChange};
use super::{findings, period, values, wiring};
use crate::analysis::Analysis;
use crate::circuit::{Behaviour, ElementId};
use crate::operating::{self, Operating};
use crate::review::Record;
use std::collections::BTreeSet;

/// Everything that differs between two analyses.
pub(super) fn between(old: Analysis, new: Analysis, pairs: &Pairs, share: f64) -> Comparison {
    let mut comparison = Comparison::default();
    if let (Some(before), Some(after)) = (&old.operating, &new.operating) {
        let all = twins((&old.circuit, before), (&new.circuit, after), pairs);
        comparison.verdicts = verdicts(&all);
        let sides = Sides { old: &old, new: &new, before, after, pairs };
        for twin in &all.both {
            sides.add(*twin, share, &mut comparison);
        }
    }
    period::add(&old, &new, pairs, share, &mut comparison);
    comparison.wiring = wiring::between(&old.circuit, &new.circuit, pairs);
    let (old_circuit, new_circuit) = (old.circuit.clone(), new.circuit.clone());
    comparison.findings = findings::between(
        (&old_circuit, Record::of(old, false)),
        (&new_circuit, Record::of(new, false)),
        pairs,
    );
    comparison
}

fn verdicts(twins: &Twins<'_>) -> Vec<VerdictChange> {
    let both = twins.both.iter().filter(|t| t.old.verdict != t.new.verdict).map(|t| VerdictChange {
        case: t.new.name.clone(),
        old: Some(t.old.verdict),
        new: Some(t.new.verdict),
    });
    let gone =
        twins.gone.iter().map(|c| VerdictChange { case: c.name.clone(), old: Some(c.verdict), new: None });
    let added =
        twins.added.iter().map(|c| VerdictChange { case: c.name.clone(), old: None, new: Some(c.verdict) });
    both.chain(added).chain(gone).collect()
}

struct Sides<'a> {
    old: &'a Analysis,
    new: &'a Analysis,
    before: &'a Operating,
    after: &'a Operating,
    pairs: &'a Pairs,
}

impl Sides<'_> {
    fn add(&self, twin: Twin<'_>, share: f64, comparison: &mut Comparison) {
        let mut flipped: BTreeSet<ElementId> = BTreeSet::new();
        for pair in &self.pairs.elements {
            if !matches!(self.new.circuit.element(pair.new).behaviour, Behaviour::Diode { .. }) {
                continue;
            }
            let was = seen(self.before, twin.old, pair.old);
            let is = seen(self.after, twin.new, pair.new);
            let (Some((old_state, old)), Some((new_state, new))) = (was, is) else { continue };
            if old_state != new_state {
                flipped.insert(pair.new);
                comparison.states.push(StateChange {
                    diode: self.new.circuit.element_name(pair.new),
                    case: twin.new.name.clone(),
                    old: old_state,
                    new: new_state,
                    old_current: current(twin.old, old),
                    new_current: current(twin.new, new),
                    why: operating::against(&self.new.circuit, twin.new, new, old.state),
                });
            }
            if let (Some(before), Some(after)) = (old.trust, new.trust)
                && before != after
            {
                comparison.trust.push(TrustChange {
                    diode: self.new.circuit.element_name(pair.new),
                    case: twin.new.name.clone(),
                    old: before,
                    new: after,
                });
            }
        }
        let new = (&self.new.circuit, self.after);
        let old = (&self.old.circuit, self.before);
        comparison.currents.extend(values::currents(new, old, twin, self.pairs, share, &flipped));
        comparison.voltages.extend(values::voltages(new, self.before, twin, self.pairs, share));
    }
}
