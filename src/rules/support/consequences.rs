//! One cause, one finding: what follows from a finding that is told already is left out.

use crate::finding::{Finding, Severity};
use rustc_hash::FxHashMap;

/// Rules from cause to consequence: of two findings that name one diode, the one whose rule stands first is the cause.
/// Rules that are not listed are neither.
const FROM_CAUSE: [&str; 53] = [
    "supply-against-its-name",
    "pulse-below-ground",
    "switch-across-supply",
    "forward-across-source",
    "opposed-in-series",
    "reversed-bridge-leg",
    "missing-bridge-leg",
    "reversed-across-transistor",
    "reversed-freewheel",
    "reversed-gate-clamp",
    "transistor-fed-backwards",
    "forward-when-switched",
    "reversed-clamp",
    "odd-one-out",
    "points-at-its-source",
    "zener-bypassed",
    "idle-source",
    "starved-part",
    "dark-branch",
    "indicator-never-lit",
    "uneven-ring",
    "supplies-tied",
    "clamp-rail-unheld",
    "zener-forward",
    "zener-forward-over-time",
    "clamp-in-use",
    "undriven-control",
    "unlimited-current",
    "no-limiting-resistor",
    "unfed-part",
    "blocked-current",
    "driven-beyond-supplies",
    "never-conducts",
    "unstored-stage",
    "no-lasting-current",
    "idle-rectifier",
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

/// Leaves out each finding about something that an earlier cause names, among those that are shown: what is accepted or
/// switched off explains nothing. What is worse than its cause stays, or the exit code would not see it. Order is kept.
/// Findings that an expectation or a rating gives stand for themselves: a person asked for them.
pub fn fold(findings: &mut Vec<Finding>) {
    let causes = Causes::of(findings);
    findings.retain(|finding| !causes.explain(finding));
}

fn rank(finding: &Finding) -> Option<usize> {
    FROM_CAUSE.iter().position(|&rule| rule == finding.rule)
}

/// The first cause that names something, by name: among warnings and errors, and among errors alone.
#[derive(Default)]
struct Causes {
    naming: FxHashMap<String, [usize; 2]>,
    /// Only those whose first name it is.
    about: FxHashMap<String, [usize; 2]>,
}

impl Causes {
    fn of(findings: &[Finding]) -> Causes {
        let mut causes = Causes::default();
        for finding in findings.iter().filter(|f| f.severity > Severity::Note && f.accepted.is_none()) {
            let Some(rank) = rank(finding) else { continue };
            let is_error = finding.severity == Severity::Error;
            for (n, name) in finding.subjects.iter().enumerate() {
                keep_first(&mut causes.naming, name, rank, is_error);
                if n == 0 {
                    keep_first(&mut causes.about, name, rank, is_error);
                }
            }
        }
        causes
    }

    fn explain(&self, finding: &Finding) -> bool {
        let (Some(own), Some(main)) = (rank(finding), finding.subjects.first()) else { return false };
        // ratings are asked for, and what is accepted is counted
        if finding.rule == "over-rating" || finding.accepted.is_some() {
            return false;
        }
        let among = usize::from(finding.severity == Severity::Error);
        let comes_first = |first: Option<&[usize; 2]>| first.is_some_and(|ranks| ranks[among] < own);
        comes_first(self.naming.get(main))
            || finding.subjects.iter().any(|name| comes_first(self.about.get(name)))
    }
}

fn keep_first(known: &mut FxHashMap<String, [usize; 2]>, name: &str, rank: usize, is_error: bool) {
    let first = known.entry(name.to_owned()).or_insert([usize::MAX; 2]);
    first[0] = first[0].min(rank);
    if is_error {
        first[1] = first[1].min(rank);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::text::{FileId, Span};

    fn finding(rule: &'static str, severity: Severity, subjects: &[&str]) -> Finding {
        let blank = Finding::new(rule, severity, Span::new(FileId(0), 0, 0), "");
        subjects.iter().fold(blank, |f, s| f.about(*s))
    }

    fn left(findings: &[Finding]) -> Vec<&'static str> {
        let mut findings = findings.to_vec();
        fold(&mut findings);
        findings.iter().map(|f| f.rule).collect()
    }

    #[test]
    fn a_consequence_is_left_out_and_one_that_is_worse_is_not() {
        let cause = finding("reversed-clamp", Severity::Warning, &["D1", "in"]);
        let mild = finding("never-conducts", Severity::Warning, &["D1"]);
        let worse = finding("unlimited-current", Severity::Error, &["D1"]);
        assert_eq!(left(&[cause.clone(), mild.clone()]), ["reversed-clamp"]);
        assert_eq!(
            left(&[mild, worse.clone(), cause.clone()]),
            ["unlimited-current", "reversed-clamp"],
            "what is worse stays"
        );
        let raised = Finding { severity: Severity::Error, ..cause };
        assert_eq!(left(&[raised, worse]), ["reversed-clamp"], "an error explains an error");
    }

    #[test]
    fn only_what_is_shown_explains() {
        let cause = finding("zener-forward", Severity::Warning, &["D1"]);
        let accepted = Finding { accepted: Some("a test jig".into()), ..cause.clone() };
        let note = finding("small-headroom", Severity::Note, &["D1"]);
        assert_eq!(left(&[cause.clone(), note.clone()]), ["zener-forward"]);
        assert_eq!(left(&[accepted, note.clone()]), ["zener-forward", "small-headroom"]);
        let kept = Finding { accepted: Some("known".into()), ..note };
        assert_eq!(
            left(&[cause, kept]),
            ["zener-forward", "small-headroom"],
            "accepted findings are counted"
        );
    }

    #[test]
    fn findings_belong_together_by_the_main_name_of_either() {
        let cause = finding("reversed-clamp", Severity::Warning, &["D1", "out"]);
        let by_cause = finding("small-headroom", Severity::Note, &["R1", "D1"]);
        let by_own = finding("open-potential", Severity::Note, &["out", "R2"]);
        let neither = finding("open-potential", Severity::Note, &["R2", "out"]);
        assert_eq!(left(&[cause, by_cause, by_own, neither]), ["reversed-clamp", "open-potential"]);
    }

    #[test]
    fn a_supply_on_its_head_explains_what_stands_on_it() {
        let warning = Severity::Warning;
        let supply = finding("supply-against-its-name", warning, &["V24", "v24"]);
        let others = [
            finding("forward-when-switched", warning, &["D1", "Q1", "V24"]),
            finding("transistor-fed-backwards", warning, &["Q1", "V24"]),
            finding("starved-part", warning, &["D7", "V5"]),
        ];
        let all = [&[supply][..], &others].concat();
        assert_eq!(left(&all), ["supply-against-its-name", "starved-part"]);
    }

    #[test]
    fn a_rating_stands_for_itself() {
        let cause = finding("no-limiting-resistor", Severity::Warning, &["D1"]);
        let rating = finding("over-rating", Severity::Warning, &["D1"]);
        assert_eq!(left(&[cause, rating]), ["no-limiting-resistor", "over-rating"]);
    }
}
