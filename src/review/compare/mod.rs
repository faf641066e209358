//! Two revisions of a circuit side by side: which element is which, which states flip, what moves, and which findings
//! come and go. Plain data; how it is shown is `report`'s.

mod cases;
mod differences;
mod findings;
mod matching;
mod nodes;
mod outcome;
mod period;
mod values;
mod wiring;

pub use outcome::{Comparison, FindingsChange, Move, StateChange, TrustChange, VerdictChange, WiringChange};

use crate::analysis::{Analysis, analyse};
use crate::circuit::{self, Behaviour, Circuit, Model};
use crate::config::Options;
use crate::operating::DropOrigin;
use crate::text::{LoadProblem, Loader};
use matching::Pairs;
use std::collections::BTreeMap;
use std::path::Path;

/// One of two revisions: where its files come from, its root file, and how it is to be examined.
pub struct Revision<'a> {
    /// Where its files come from.
    pub loader: &'a mut dyn Loader,
    /// Its root file.
    pub root: &'a Path,
    /// How it is examined.
    pub options: &'a Options,
}

/// Compares two revisions. The new one is judged with the drop decades of the old wherever the model is the same, so
/// that the edge of a decade is no news.
///
/// # Errors
/// Where a root file cannot be had, or the options set a source that neither revision has; the words say which.
pub fn compare(old: Revision<'_>, new: Revision<'_>) -> Result<Comparison, LoadProblem> {
    let named = |path: &Path, problem: LoadProblem| LoadProblem(format!("{}: {}", path.display(), problem.0));
    let before = analyse(old.loader, old.root, old.options).map_err(|e| named(old.root, e))?;
    let reading = circuit::read(new.loader, new.root, new.options).map_err(|e| named(new.root, e))?;
    let pairs = Pairs::of(&before.circuit, &reading.circuit);
    let options = Options { decades: decades(&before, &reading.circuit, &pairs), ..new.options.clone() };
    let after = analyse(new.loader, new.root, &options).map_err(|e| named(new.root, e))?;
    if let (Some(_), Some(finding)) = (before.not_set(old.options), after.not_set(new.options)) {
        return Err(named(new.root, LoadProblem(finding.message.clone())));
    }
    Ok(differences::between(before, after, &pairs, new.options.thresholds.moved))
}

/// The decades at which the old revision holds its drops, for diodes whose model did not change.
fn decades(old: &Analysis, new: &Circuit, pairs: &Pairs) -> BTreeMap<String, i32> {
    let mut held = BTreeMap::new();
    let first = old.operating.iter().flat_map(|o| &o.cases).find_map(|case| case.solutions.first());
    for diode in first.iter().flat_map(|s| &s.diodes) {
        let DropOrigin::Model { decade, .. } = diode.drop.origin else { continue };
        let Some(pair) = pairs.of_old(diode.element) else { continue };
        if same_model(&old.circuit, new, pair.old, pair.new) {
            #[allow(clippy::cast_possible_truncation, reason = "a power of ten of a current")]
            held.insert(new.element_name(pair.new).to_lowercase(), decade.log10().round() as i32);
        }
    }
    held
}

fn same_model(old: &Circuit, new: &Circuit, a: circuit::ElementId, b: circuit::ElementId) -> bool {
    let model = |circuit: &Circuit, id| match circuit.element(id).behaviour {
        Behaviour::Diode { model: Some(model), area } => Some((essence(circuit.model(model)), area)),
        _ => None,
    };
    model(old, a).is_some_and(|one| model(new, b).is_some_and(|other| one == other))
}

/// Parameters and their values, without the places where they are written.
fn essence(model: &Model) -> Vec<(String, f64)> {
    let mut all: Vec<(String, f64)> =
        model.parameters.iter().map(|(name, value)| (name.clone(), value.number)).collect();
    all.sort_by(|a, b| a.0.cmp(&b.0));
    all
}
