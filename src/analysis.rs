//! Runs the stages in order and owns every result. Read this first; nothing is computed here.

use crate::circuit::{self, Circuit};
use crate::config::Options;
use crate::finding::{self, Finding};
use crate::operating::{self, Operating};
use crate::rules::{self, Evidence, Skipped};
use crate::swing::{self, Swing};
use crate::text::{LoadProblem, Loader, Sources};
use crate::topology::Wiring;
use std::path::Path;

/// Everything known about one root file.
#[derive(Debug)]
pub struct Analysis {
    /// All files that were opened; number 0 is the root.
    pub sources: Sources,
    /// The flat circuit.
    pub circuit: Circuit,
    /// Facts of its wiring.
    pub wiring: Wiring,
    /// States for each condition, where asked for.
    pub operating: Option<Operating>,
    /// What moves over time and over the conditions, where asked for.
    pub swing: Option<Swing>,
    /// Whether some condition has no answer, or one that does not check, leaving out what an instant taken by itself
    /// cannot judge.
    pub hopeless: bool,
    /// All findings, sorted.
    pub findings: Vec<Finding>,
    /// Rules that could not judge.
    pub skipped: Vec<Skipped>,
}

impl Analysis {
    /// The finding about a source that the options set and the circuit does not have: whoever lists no findings must tell
    /// this one, since the figures are not those that were asked for.
    pub fn not_set(&self, options: &Options) -> Option<&Finding> {
        let is_ours = |f: &&Finding| {
            f.rule == "unknown-name"
                && f.severity == finding::Severity::Error
                && options.set.iter().any(|(name, _)| f.subjects.contains(name))
        };
        self.findings.iter().find(is_ours)
    }
}

/// Analyses the file at `root`.
///
/// # Errors
/// Only where the root file itself cannot be had; everything else is a finding.
pub fn analyse(loader: &mut dyn Loader, root: &Path, options: &Options) -> Result<Analysis, LoadProblem> {
    let circuit::Reading { sources, parsed, circuit, mut findings } = circuit::read(loader, root, options)?;
    let wiring = Wiring::of(&circuit);
    let operating = options.states.then(|| {
        let text = operating::Text { sources: &sources, parsed: &parsed };
        let (operating, about_notes) = operating::evaluate(&circuit, Some(text), options);
        findings.extend(about_notes);
        operating
    });
    let swing = operating.as_ref().filter(|_| options.swing);
    let swing = swing.map(|states| swing::follow(&circuit, states, &wiring.noted, options));
    let mut evidence = Evidence::new(&sources, &circuit, &wiring).with_thresholds(options.thresholds);
    let levels = &options.levels;
    let (judged, skipped) = rules::run(&mut evidence, &findings, operating.as_ref(), swing.as_ref(), levels);
    let hopeless = operating.as_ref().is_some_and(|o| rules::is_hopeless(&evidence, o));
    let mut findings = rules::settle(&evidence, findings, judged, &skipped, levels);
    finding::sort(&mut findings);
    Ok(Analysis { sources, circuit, wiring, operating, swing, hopeless, findings, skipped })
}
