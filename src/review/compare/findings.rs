//! Findings that come, go and stay, names of the old revision read as those of the new.

use super::super::baseline::Baseline;
use super::super::record::Record;
use super::matching::Pairs;
use super::outcome::FindingsChange;
use crate::circuit::Circuit;
use std::collections::BTreeMap;
use std::path::Path;

/// Sorts the findings of both revisions.
pub(super) fn between(old: (&Circuit, Record), new: (&Circuit, Record), pairs: &Pairs) -> FindingsChange {
    let (before, mut after) = (old.1, new.1);
    let names = Names::of(old.0, new.0, pairs);
    let mut translated = before.clone();
    for finding in &mut translated.findings {
        for subject in &mut finding.subjects {
            names.translate(subject);
        }
    }
    let open = |record: &mut Record| record.findings.retain(|f| f.accepted.is_none());
    open(&mut after);
    open(&mut translated);
    let mut gone = before;
    open(&mut gone);
    // both lists stand in one order, so that what goes is told in its own words
    let originals = std::mem::take(&mut gone.findings);
    let label = Path::new("");
    let (mut was, mut is) = (Baseline::default(), Baseline::default());
    was.add(&translated, label);
    is.add(&after, label);
    gone.findings = originals
        .into_iter()
        .zip(&translated.findings)
        .filter(|(_, renamed)| !is.take_one(&translated.sources, renamed, label))
        .map(|(own, _)| own)
        .collect();
    was.sift(&mut after, label);
    let kept = after.known.len();
    FindingsChange { new: after, gone, kept }
}

/// Old names, in lower case, to new ones.
struct Names(BTreeMap<String, String>);

impl Names {
    fn of(old: &Circuit, new: &Circuit, pairs: &Pairs) -> Self {
        let nodes = pairs.nodes.iter().map(|(a, b)| (old.node_name(a), new.node_name(b)));
        let elements = pairs.elements.iter().map(|p| (old.element_name(p.old), new.element_name(p.new)));
        let differ = |(a, b): &(String, String)| !a.eq_ignore_ascii_case(b);
        Names(nodes.chain(elements).filter(differ).map(|(a, b)| (a.to_lowercase(), b)).collect())
    }

    fn translate(&self, subject: &mut String) {
        let own = subject.to_lowercase();
        // a subject may be written as `v(node)`
        let inner = own.strip_prefix("v(").and_then(|rest| rest.strip_suffix(')'));
        if let Some(new) = self.0.get(&own) {
            subject.clone_from(new);
        } else if let Some(new) = inner.and_then(|node| self.0.get(node)) {
            *subject = format!("v({new})");
        }
    }
}
