//! Collects findings and tells each once, however many instances repeat it.

use crate::finding::Finding;
use crate::text::Span;
use rustc_hash::FxHashMap;

/// Findings so far.
#[derive(Debug, Default)]
pub(crate) struct Told {
    findings: Vec<Finding>,
    counts: Vec<usize>,
    known: FxHashMap<(&'static str, Span), usize>,
}

impl Told {
    /// Takes a finding, or counts it where the same rule has spoken of the same place before.
    pub fn tell(&mut self, finding: Finding) {
        let at = *self.known.entry((finding.rule, finding.span)).or_insert(self.findings.len());
        match self.counts.get_mut(at) {
            Some(count) => *count += 1,
            None => {
                self.findings.push(finding);
                self.counts.push(1);
            }
        }
    }

    /// All of them; those told more than once say how often.
    pub fn finish(self) -> Vec<Finding> {
        let counted = |(mut finding, count): (Finding, usize)| {
            if count > 1 {
                finding.message.push_str(&format!(" (the same in {count} instances)"));
            }
            finding
        };
        self.findings.into_iter().zip(self.counts).map(counted).collect()
    }
}
