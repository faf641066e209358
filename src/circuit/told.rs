//! Collects findings and tells each once, however many instances repeat it.

use crate::finding::{Finding, Severity};
use crate::text::Span;
use rustc_hash::FxHashMap;

/// So many findings of one rule are listed; the rest is counted.
pub(super) const MOST_OF_ONE_RULE: usize = 1000;

/// Findings so far.
#[derive(Debug, Default)]
pub(crate) struct Told {
    findings: Vec<Finding>,
    /// How often each was told, and whether inside an instance.
    counts: Vec<(usize, bool)>,
    known: FxHashMap<(&'static str, Span), usize>,
    rules: FxHashMap<&'static str, usize>,
}

impl Told {
    /// Takes a finding, or counts it where the same rule has spoken of the same place before.
    pub fn tell(&mut self, finding: Finding, in_instance: bool) {
        let key = (finding.rule, finding.span);
        if let Some(&at) = self.known.get(&key) {
            self.counts[at].0 += 1;
            return;
        }
        let of_rule = self.rules.entry(finding.rule).or_default();
        *of_rule += 1;
        if *of_rule <= MOST_OF_ONE_RULE {
            self.known.insert(key, self.findings.len());
            self.findings.push(finding);
            self.counts.push((1, in_instance));
        }
    }

    /// All of them; those told more than once say how often.
    pub fn finish(self) -> Vec<Finding> {
        let counted = |(mut finding, (count, in_instance)): (Finding, (usize, bool))| {
            if count > 1 && in_instance {
                finding.message.push_str(&format!(" (the same in {count} instances)"));
            }
            finding
        };
        self.findings.into_iter().zip(self.counts).map(counted).collect()
    }
}

/// Says of each rule with too many findings how many are not listed, at the last that is.
pub(super) fn tell_rest(findings: &mut Vec<Finding>, counts: &FxHashMap<&'static str, usize>) {
    let mut rules: Vec<_> = counts.iter().filter(|(_, count)| **count > MOST_OF_ONE_RULE).collect();
    rules.sort_unstable();
    for (rule, count) in rules {
        let Some(last) = findings.iter().rev().find(|f| f.rule == *rule) else { continue };
        let more = count - MOST_OF_ONE_RULE;
        let finding = Finding::new(
            "limit-reached",
            Severity::Note,
            last.span,
            format!("{more} more findings of {rule} are not listed"),
        )
        .label("the last that is listed")
        .help("Mend those that are listed and run it again; a file with so many is perhaps no netlist.");
        findings.push(finding);
    }
}

impl Told {
    /// Whether further findings of the rule are only counted.
    pub fn is_full(&self, rule: &str) -> bool {
        self.rules.get(rule).is_some_and(|&count| count >= MOST_OF_ONE_RULE)
    }

    /// How many findings of each rule there were.
    pub fn counts(&self) -> FxHashMap<&'static str, usize> {
        self.rules.clone()
    }
}
