//! One finding for a definition, not one for each of its instances.

use crate::circuit::Circuit;
use crate::finding::Finding;
use crate::text::Span;
use rustc_hash::FxHashMap;

/// Folds findings of one rule at one place inside several instances into the first of them, which then says in
/// how many instances the same is found. Order is kept.
pub fn fold(circuit: &Circuit, findings: Vec<Finding>) -> Vec<Finding> {
    let instances = count_instances(circuit);
    let mut kept: Vec<(Finding, Met)> = Vec::with_capacity(findings.len());
    let mut seen: FxHashMap<(&'static str, bool, Span, Vec<Span>), usize> = FxHashMap::default();
    for finding in findings {
        // a trail that ends in an include leads to no instance
        if !finding.trail.last().is_some_and(|step| instances.contains_key(&step.span)) {
            kept.push((finding, Met { count: 1, alike: true }));
            continue;
        }
        // what is accepted in one instance may not be in another
        let accepted = finding.accepted.is_some();
        let key = (finding.rule, accepted, finding.span, finding.labels.iter().map(|l| l.span).collect());
        let at = *seen.entry(key).or_insert(kept.len());
        match kept.get_mut(at) {
            Some((first, met)) => {
                met.count += 1;
                met.alike &= without_paths(&first.message) == without_paths(&finding.message);
            }
            None => kept.push((finding, Met { count: 1, alike: true })),
        }
    }
    kept.into_iter().map(|(finding, met)| with_count(finding, met, &instances)).collect()
}

/// In how many instances a finding was met, and whether it says the same in all of them.
#[derive(Clone, Copy)]
struct Met {
    count: usize,
    alike: bool,
}

/// A message without the paths that lead to the names in it.
fn without_paths(message: &str) -> String {
    let own = |word: &str| match word.rsplit_once(':') {
        Some((_, own)) if !own.is_empty() => own.to_owned(),
        _ => word.trim_start_matches('`').to_owned(),
    };
    message.split(' ').map(own).collect::<Vec<_>>().join(" ")
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

fn with_count(mut finding: Finding, met: Met, instances: &FxHashMap<Span, (String, usize)>) -> Finding {
    let known = finding.trail.last().and_then(|step| instances.get(&step.span));
    if let Some((name, all)) = known
        && *all > 1
    {
        let count = met.count;
        let how = if met.alike { "the same" } else { "found, with numbers of its own," };
        finding.message.push_str(&match count {
            _ if count == *all => format!(" ({how} in all {all} instances of {name})"),
            1 => format!(" (in this one of {all} instances of {name})"),
            _ => format!(" ({how} in {count} of {all} instances of {name})"),
        });
    }
    finding
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paths_make_no_difference_and_numbers_do() {
        let one = "XA:D1 carries 30.3 mA, more than `XA:n` allows";
        assert_eq!(without_paths(one), without_paths("XB:D1 carries 30.3 mA, more than `X1:XB:n` allows"));
        assert_ne!(without_paths(one), without_paths("XB:D1 carries 301 mA, more than `XB:n` allows"));
    }
}
