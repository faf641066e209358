//! The rules. One file a rule: its description, its failing and passing example, its check. The list is made
//! from the files by the build script, so adding a rule is adding a file. What rules share is in `support/`;
//! facts belong in `topology`, results in `operating`: a rule only judges.

mod support;

use support::{About, Claim, Found, LooseEnd, Outcome, Rivals, claims, expected};
pub use support::{Check, Evidence, Group, Rule, Skipped, is_hopeless, run, settle};
use support::{Regions, Seen, Shown, behind, causes, count, in_cases, is_told, list, turn_round};

include!(concat!(env!("OUT_DIR"), "/rules.rs"));

/// All rules, sorted by name.
pub fn all() -> &'static [&'static Rule] {
    ALL
}

/// The rule of that name.
pub fn find(name: &str) -> Option<&'static Rule> {
    ALL.iter().copied().find(|rule| rule.name == name)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_rule_is_named_like_its_file_and_says_everything() {
        for (stem, rule) in FILES.iter().zip(ALL) {
            assert_eq!(stem.replace('_', "-"), rule.name, "file and rule must have one name");
            for (what, text) in [
                ("summary", rule.summary),
                ("why", rule.why),
                ("remedy", rule.remedy),
                ("failing", rule.failing),
                ("passing", rule.passing),
            ] {
                assert!(!text.trim().is_empty(), "{}: no {what}", rule.name);
            }
            assert!(!rule.summary.contains('\n'), "{}: the summary is one line", rule.name);
        }
        let names: Vec<_> = all().iter().map(|r| r.name).collect();
        assert!(names.is_sorted(), "{names:?}");
        assert!(names.iter().all(|n| find(n).is_some()));
        assert!(find("no such rule").is_none());
    }
}
