//! Currents whose split the model leaves open.

use super::{Check, Evidence, Group, Rule, in_cases, is_told, list};
use crate::circuit::{ElementId, NodeId};
use crate::finding::{Finding, Severity, interval};
use crate::operating::{Case, Interval, Operating};
use petgraph::unionfind::UnionFind;
use rustc_hash::FxHashMap;
use std::collections::BTreeMap;

pub const RULE: Rule = Rule {
    name: "open-split",
    group: Group::States,
    severity: Severity::Note,
    also: None,
    summary: "how a current splits between branches is left open by the constant-drop model",
    why: "Around the loop the drops and sources sum to exactly zero, so every split of the current satisfies the \
          laws. Real parts decide by their spread; the table prints the interval.",
    remedy: "Where the split matters, give each branch its own resistance, or look at it with the exponential \
             law.",
    source: Some(
        "Equal drops in parallel make the complementarity matrix semidefinite, not definite: Cottle, \
                  Pang & Stone, The Linear Complementarity Problem, 1992",
    ),
    failing: "tide gauge buoy: two detectors on one node\n\
              VIN in 0 5\n\
              R1 in out 1k\n\
              D1 out 0 DA\n\
              D2 out 0 DB\n\
              .model DA D(IS=2.5n N=1.75)\n\
              .model DB D(IS=2.5n N=1.75)\n",
    passing: "tide gauge buoy: two detectors on one node\n\
              VIN in 0 5\n\
              R1 in out1 1k\n\
              R2 in out2 1k\n\
              D1 out1 0 DA\n\
              D2 out2 0 DB\n\
              .model DA D(IS=2.5n N=1.75)\n\
              .model DB D(IS=2.5n N=1.75)\n",
    check: Check::States(check),
};

fn check(evidence: &Evidence<'_>, operating: &Operating) -> Vec<Finding> {
    let mut found: Vec<(Split, Vec<usize>)> = Vec::new();
    let mut known: FxHashMap<Vec<ElementId>, usize> = FxHashMap::default();
    for (number, case) in operating.cases.iter().enumerate() {
        for split in splits(evidence, case) {
            let at = *known.entry(split.elements.clone()).or_insert(found.len());
            match found.get_mut(at) {
                Some((_, cases)) => cases.push(number),
                None => found.push((split, vec![number])),
            }
        }
    }
    let told = found.iter().filter(|(split, _)| !is_told(evidence, &split.elements));
    told.map(|(split, cases)| judge(evidence, operating, split, cases)).collect()
}

/// Branches among which a current splits as it likes, in order, and the interval of the first of them.
struct Split {
    elements: Vec<ElementId>,
    interval: Interval,
}

/// The open splits of one condition. Loops of inductors and 0 Ω alone are none: their split is of no account.
fn splits(evidence: &Evidence<'_>, case: &Case) -> Vec<Split> {
    let Some(solution) = case.solutions.first() else { return Vec::new() };
    let diodes = solution.diodes.iter().map(|d| (d.element, d.current));
    let others = solution.branches.iter().map(|b| (b.element, b.current));
    let mut open: Vec<(ElementId, Interval)> =
        diodes.chain(others).filter_map(|(id, current)| Some((id, current.interval()?))).collect();
    open.sort_by_key(|o| o.0);
    // branches that meet anywhere but at ground take part in one split
    let mut sets = UnionFind::<u32>::new(open.len());
    let mut first_at: FxHashMap<NodeId, u32> = FxHashMap::default();
    for (n, (id, _)) in open.iter().enumerate() {
        for pin in evidence.circuit.pins(*id).iter().take(2).filter(|p| p.node != NodeId::GROUND) {
            sets.union(*first_at.entry(pin.node).or_insert(n as u32), n as u32);
        }
    }
    let mut groups: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for n in 0..open.len() {
        groups.entry(sets.find(n as u32)).or_default().push(n);
    }
    let is_driven = |id: &ElementId| b"DVEH".contains(&evidence.circuit.element(*id).letter);
    let splits = groups.into_values().filter_map(|members| {
        let elements: Vec<ElementId> = members.iter().map(|&n| open[n].0).collect();
        let interval = open[*members.first()?].1;
        elements.iter().any(is_driven).then_some(Split { elements, interval })
    });
    let mut splits: Vec<Split> = splits.collect();
    splits.sort_by(|a, b| a.elements.cmp(&b.elements));
    splits
}

fn judge(evidence: &Evidence<'_>, operating: &Operating, split: &Split, cases: &[usize]) -> Finding {
    let names: Vec<String> = split.elements.iter().map(|&id| evidence.name(id)).collect();
    let first = split.elements[0];
    let message = format!(
        "how the current splits between {} is open: {} may carry {}{}",
        list(&names),
        names[0],
        interval(split.interval.low, split.interval.high, "A"),
        in_cases(operating, cases)
    );
    let mut finding = evidence.about(&RULE, first, message).label("takes an open share");
    for &id in split.elements.iter().skip(1).take(8) {
        finding = finding.also(evidence.statement(id), "as does this");
    }
    finding.subjects.extend(names.into_iter().skip(1));
    finding.help(format!("{} {}", RULE.why, RULE.remedy))
}
