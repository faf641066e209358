//! One finding for a definition, not one for each of its instances.

use crate::circuit::Circuit;
use crate::finding::Finding;
use crate::text::Span;
use rustc_hash::FxHashMap;

/// Folds findings of one rule at one place inside several instances into the first of them, which then says in
/// how many instances the same is found. Order is kept.
pub fn fold(circuit: &Circuit, findings: Vec<Finding>) -> Vec<Finding> {
    let instances = count_instances(circuit);
    let mut kept: Vec<(Finding, usize)> = Vec::with_capacity(findings.len());
    let mut seen: FxHashMap<(&'static str, bool, Span, Vec<Span>), usize> = FxHashMap::default();
    for finding in findings {
        // a trail that ends in an include leads to no instance
        if !finding.trail.last().is_some_and(|step| instances.contains_key(&step.span)) {
            kept.push((finding, 1));
            continue;
        }
        // what is accepted in one instance may not be in another
        let accepted = finding.accepted.is_some();
        let key = (finding.rule, accepted, finding.span, finding.labels.iter().map(|l| l.span).collect());
        let at = *seen.entry(key).or_insert(kept.len());
        match kept.get_mut(at) {
            Some((_, count)) => *count += 1,
            None => kept.push((finding, 1)),
        }
    }
    kept.into_iter().map(|(finding, count)| with_count(finding, count, &instances)).collect()
}

/// How many instances each subcircuit has, by the span of the call's last step: all calls of one definition.
fn count_instances(circuit: &Circuit) -> FxHashMap<Span, (String, usize)> {
    let mut by_definition: FxHashMap<Span, usize> = FxHashMap::default();
    for scope in circuit.scopes.iter().filter(|s| s.parent.is_some()) {
        *by_definition.entry(scope.definition).or_insert(0) += 1;
    }
    let mut by_call = FxHashMap::default();
    for scope in circuit.scopes.iter().filter(|s| s.parent.is_some()) {
        let count = by_definition.get(&scope.definition).copied().unwrap_or(1);
        by_call.entry(scope.call).or_insert_with(|| (circuit.text(scope.subcircuit).to_owned(), count));
    }
    by_call
}

fn with_count(mut finding: Finding, count: usize, instances: &FxHashMap<Span, (String, usize)>) -> Finding {
    let known = finding.trail.last().and_then(|step| instances.get(&step.span));
    if let Some((name, all)) = known
        && *all > 1
    {
        finding.message.push_str(&match count {
            _ if count == *all => format!(" (the same in all {all} instances of {name})"),
            1 => format!(" (in this one of {all} instances of {name})"),
            _ => format!(" (the same in {count} of {all} instances of {name})"),
        });
    }
    finding
}
