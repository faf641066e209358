//! What the states say, told once over all conditions.

use super::{Evidence, Rule};
use crate::circuit::{ElementId, ScopeId};
use crate::finding::Finding;
use crate::operating::{Case, Cause, Operating, Verdict};
use crate::text::{FileId, Span};
use rustc_hash::{FxHashMap, FxHashSet};

/// One cause and the conditions in which it shows.
pub struct Shown<'a> {
    /// As the first of the conditions tells it.
    pub cause: &'a Cause,
    /// Numbers of the conditions.
    pub cases: Vec<usize>,
}

/// The causes that lead to `verdict`, those about the same elements as one, in order of first appearance.
pub fn causes<'o>(evidence: &Evidence<'_>, operating: &'o Operating, verdict: Verdict) -> Vec<Shown<'o>> {
    let mut causes: Vec<Shown<'o>> = Vec::new();
    let mut known: FxHashMap<(Vec<ElementId>, &str), usize> = FxHashMap::default();
    for (number, case) in operating.cases.iter().enumerate() {
        for cause in case.causes.iter().filter(|c| c.verdict == verdict) {
            if is_no_matter_of_an_instant(evidence, cause) {
                continue;
            }
            let at = *known.entry(identity(cause)).or_insert(causes.len());
            match causes.get_mut(at) {
                Some(known) if known.cases.last() == Some(&number) => {}
                Some(known) => known.cases.push(number),
                None => causes.push(Shown { cause, cases: vec![number] }),
            }
        }
    }
    causes
}

/// Whether some condition has no answer, or one that does not check, for a cause that one instant can judge.
pub fn is_hopeless(evidence: &Evidence<'_>, operating: &Operating) -> bool {
    let counts = |verdict| matches!(verdict, Verdict::None | Verdict::Unverified);
    operating.cases.iter().filter(|case| counts(case.verdict)).any(|case| {
        let mut causes = case.causes.iter().filter(|c| counts(c.verdict)).peekable();
        causes.peek().is_none() || causes.any(|c| !is_no_matter_of_an_instant(evidence, c))
    })
}

/// What one instant cannot judge: a moving source that drives an inductor, and a controlled current into
/// capacitors alone, which integrates: what feedback makes of it is no matter of one instant.
fn is_no_matter_of_an_instant(evidence: &Evidence<'_>, cause: &Cause) -> bool {
    let mut driven = evidence.wiring.cuts.iter().filter(|cut| cut.driven).flat_map(|cut| &cut.leads);
    cause.left_to_time || driven.any(|id| cause.elements.contains(id))
}

/// The same elements, in whatever order the walk begins; without elements the words decide.
fn identity(cause: &Cause) -> (Vec<ElementId>, &str) {
    let mut elements = cause.elements.clone();
    elements.sort();
    let text = if elements.is_empty() { cause.text.as_str() } else { "" };
    (elements, text)
}

/// ` (in VIN=9 and VIN=16)`; nothing where it holds in every condition.
pub fn in_cases(operating: &Operating, numbers: &[usize]) -> String {
    if numbers.len() >= operating.cases.len() {
        return String::new();
    }
    let names: Vec<String> =
        numbers.iter().filter_map(|&n| operating.cases.get(n)).map(|c: &Case| c.name.clone()).collect();
    format!(" (in condition {})", super::list(&names))
}

/// Whether a finding of the wiring tells the same cause already: it names every one of these elements.
pub fn is_told(evidence: &Evidence<'_>, elements: &[ElementId]) -> bool {
    let names: Vec<String> = elements.iter().map(|&id| evidence.name(id)).collect();
    // a line that stands twice is told as such
    let distinct: FxHashSet<String> = names.iter().map(|name| name.to_lowercase()).collect();
    if distinct.len() < names.len() {
        return true;
    }
    if !names.iter().all(|name| evidence.mentions(name)) {
        return false;
    }
    let tells = |f: &Finding| names.iter().all(|name| f.subjects.contains(name));
    !names.is_empty() && evidence.told().iter().any(tells)
}

/// The finding about a cause: at its first element in the text, every other one a related place.
pub fn finding(
    rule: &Rule,
    evidence: &Evidence<'_>,
    operating: &Operating,
    shown: &Shown<'_>,
    role: &str,
) -> Finding {
    let elements = &shown.cause.elements;
    let message = format!("{}{}", shown.cause.text, in_cases(operating, &shown.cases));
    let main = main_element(evidence, elements);
    let mut finding = match main {
        Some(id) => evidence.about(rule, id, message).label(role),
        None => evidence.at(rule, ScopeId::ROOT, whole(evidence), message),
    };
    for &id in elements.iter().filter(|&&id| Some(id) != main) {
        if finding.labels.len() < MOST_LABELS {
            finding = finding.also(evidence.statement(id), role);
        }
        finding.subjects.push(evidence.name(id));
    }
    evidence.name_nodes(&mut finding, elements);
    finding.help(format!("{} {}", rule.why, rule.remedy))
}

const MOST_LABELS: usize = 12;

/// A diode is what people look at first; else the first in the text.
fn main_element(evidence: &Evidence<'_>, elements: &[ElementId]) -> Option<ElementId> {
    let is_diode = |id: &&ElementId| evidence.circuit.element(**id).letter == b'D';
    elements.iter().filter(is_diode).min().or(elements.iter().min()).copied()
}

/// Where no element is to blame: the title, else the start of the file.
fn whole(evidence: &Evidence<'_>) -> Span {
    evidence.circuit.title.unwrap_or(Span::new(FileId(0), 0, 0))
}
