//! One cause, one finding: what follows from a finding that is told already is left out.

use crate::finding::{Finding, Severity};

/// Rules from cause to consequence: of two findings that name one diode, the one whose rule stands first is the cause.
/// Rules that are not listed are neither.
const FROM_CAUSE: [&str; 38] = [
    "forward-across-source",
    "opposed-in-series",
    "reversed-bridge-leg",
    "missing-bridge-leg",
    "forward-when-switched",
    "reversed-clamp",
    "odd-one-out",
    "points-at-its-source",
    "starved-part",
    "dark-branch",
    "indicator-never-lit",
    "uneven-ring",
    "supplies-tied",
    "clamp-rail-unheld",
    "zener-forward",
    "unlimited-current",
    "no-limiting-resistor",
    "unfed-part",
    "blocked-current",
    "never-conducts",
    "no-lasting-current",
    "unmeant-breakdown",
    "over-rating",
    "near-switching",
    "parallel-diodes",
    "open-split",
    "open-potential",
    "charge-without-discharge",
    "charge-beyond-drop",
    "current-beyond-drop",
    "small-headroom",
    "leakage-matters",
    "opinions-differ",
    "below-the-knee",
    "series-resistance-counts",
    "temperature-decides",
    "detector-time-constant",
    "ripple-beyond-limit",
];

/// Leaves out each finding about something that an earlier cause names. Order is kept. Findings that an expectation or a
/// rating gives stand for themselves: a person asked for them.
pub fn fold(findings: &mut Vec<Finding>) {
    let rank = |f: &Finding| FROM_CAUSE.iter().position(|&rule| rule == f.rule);
    let causes: Vec<(usize, Vec<String>)> = findings
        .iter()
        .filter(|f| f.severity > Severity::Note)
        .filter_map(|f| Some((rank(f)?, f.subjects.clone())))
        .filter(|(_, names)| !names.is_empty())
        .collect();
    if causes.len() < 2 && findings.iter().all(|f| f.severity > Severity::Note) {
        return;
    }
    let follows = |finding: &Finding| {
        let (Some(own), Some(main)) = (rank(finding), finding.subjects.first()) else { return false };
        let tells = |names: &Vec<String>| names.contains(main) || finding.subjects.contains(&names[0]);
        // ratings are asked for
        finding.rule != "over-rating" && causes.iter().any(|(rank, names)| *rank < own && tells(names))
    };
    let keep: Vec<bool> = findings.iter().map(|f| !follows(f)).collect();
    let mut keep = keep.into_iter();
    findings.retain(|_| keep.next().unwrap_or(true));
}
