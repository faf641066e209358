//! What makes a part other than unique, in words with element names and numbers.

use super::assemble::{Assembly, Owner, Setting};
use super::result::Cause;
use crate::circuit::{Behaviour, ElementId, NodeId};
use crate::complementarity::{Branch, Law, Part, Quantity, Reason, Solution, Verdict};
use crate::finding::{self, quantity};

/// Most names that one sentence lists.
const MOST_NAMES: usize = 8;

/// The causes of a part's verdict; none where it is unique.
pub(crate) fn causes(setting: &Setting<'_>, assembly: &Assembly, part: &Part) -> Vec<Cause> {
    let words = Words { setting, assembly };
    if part.reasons.is_empty() && part.verdict == Verdict::Several {
        let text = "more than one set of states is consistent".to_owned();
        return vec![words.with(part.verdict, &words.driving(part), text)];
    }
    part.reasons.iter().map(|reason| words.cause(part, reason)).collect()
}

/// What a solution leaves open in a part: which branches share a current, which nodes have no fixed potential.
pub(crate) fn openings(
    setting: &Setting<'_>,
    assembly: &Assembly,
    part: &Part,
    solution: &Solution,
) -> Vec<Cause> {
    let words = Words { setting, assembly };
    let is_open = |list: &[Quantity], at: u32| list.get(at as usize).is_some_and(|q| q.interval().is_some());
    let mut causes = Vec::new();
    let shared: Vec<u32> =
        part.branches.iter().copied().filter(|&b| is_open(&solution.currents, b)).collect();
    if matches!(part.verdict, Verdict::Shared | Verdict::SharedFloating) && !shared.is_empty() {
        let names = list(&words.names(shared.iter().copied()));
        let text = format!("how the current divides among {names} is open");
        causes.push(words.with(Verdict::Shared, &shared, text));
    }
    let floating: Vec<u32> =
        part.nodes.iter().copied().filter(|&n| is_open(&solution.potentials, n)).collect();
    if matches!(part.verdict, Verdict::Floating | Verdict::SharedFloating) && !floating.is_empty() {
        let names: Vec<String> = floating.iter().map(|&n| setting.circuit.node_name(NodeId(n))).collect();
        let text = match names.len() {
            1 => format!("the potential of node {} is open", list(&names)),
            _ => format!("the potentials of nodes {} are open", list(&names)),
        };
        let across: Vec<u32> =
            part.branches.iter().copied().filter(|&b| is_open(&solution.voltages, b)).collect();
        causes.push(words.with(Verdict::Floating, &across, text));
    }
    causes
}

/// What one reason contributes to the verdict: where both are open, a loop leaves a split open and a cut set a
/// potential.
fn share(verdict: Verdict, reason: &Reason) -> Verdict {
    match (verdict, reason) {
        (Verdict::SharedFloating, Reason::Loop { .. }) => Verdict::Shared,
        (Verdict::SharedFloating, Reason::CutSet { .. }) => Verdict::Floating,
        _ => verdict,
    }
}

/// `A, B and C`, shortened where there are many.
pub(crate) fn list(names: &[String]) -> String {
    finding::list(names, MOST_NAMES)
}

struct Words<'a> {
    setting: &'a Setting<'a>,
    assembly: &'a Assembly,
}

impl Words<'_> {
    fn cause(&self, part: &Part, reason: &Reason) -> Cause {
        let verdict = share(part.verdict, reason);
        match reason {
            Reason::Loop { branches, gap } => self.with(verdict, branches, self.closed(branches, *gap)),
            Reason::CutSet { branches, nodes, excess } => {
                self.with(verdict, branches, self.cut(branches, nodes, *excess))
            }
            Reason::Unknown { branches } => self.with(verdict, branches, self.unknown(branches)),
            Reason::Dependent { text } => self.with(verdict, &self.driving(part), text.clone()),
        }
    }

    /// What makes a part other than passive: controlled sources and negative resistances.
    fn driving(&self, part: &Part) -> Vec<u32> {
        let drives = |law: &Law| match law {
            Law::VoltageControlled(..) | Law::CurrentControlled(..) => true,
            Law::Resistance(ohms) => *ohms < 0.0,
            _ => false,
        };
        let found: Vec<u32> =
            part.branches.iter().copied().filter(|&b| self.is(b, drives)).take(2 * MOST_NAMES).collect();
        // a passive part is named by its first elements, so that the cause has a place in the text
        if found.is_empty() { part.branches.iter().take(MOST_NAMES).copied().collect() } else { found }
    }

    fn with(&self, verdict: Verdict, branches: &[u32], text: String) -> Cause {
        Cause { verdict, text, elements: self.elements(branches), left_to_time: false }
    }

    fn branch(&self, number: u32) -> Option<&Branch> {
        self.assembly.network.branches.get(number as usize)
    }

    /// The elements of branches, each once, in their order.
    fn elements(&self, branches: &[u32]) -> Vec<ElementId> {
        let mut elements = Vec::new();
        for &number in branches {
            if let Some(&Owner::Element(id)) = self.assembly.owner.get(number as usize)
                && elements.last() != Some(&id)
                && !(elements.len() < 64 && elements.contains(&id))
            {
                elements.push(id);
            }
        }
        elements
    }

    fn name(&self, number: u32) -> String {
        match self.assembly.owner.get(number as usize) {
            Some(&Owner::Element(id)) => self.setting.circuit.element_name(id),
            Some(&Owner::Supply(n)) => {
                let node = self.setting.plan.supplies.get(n).map_or(NodeId::GROUND, |s| s.node);
                format!("the supply at {}", self.setting.circuit.node_name(node))
            }
            None => "?".into(),
        }
    }

    /// Names of branches, each owner once.
    fn names(&self, branches: impl IntoIterator<Item = u32>) -> Vec<String> {
        let mut names = Vec::new();
        for number in branches {
            let name = self.name(number);
            if names.last() != Some(&name) && !(names.len() < 64 && names.contains(&name)) {
                names.push(name);
            }
        }
        names
    }

    fn closed(&self, branches: &[u32], gap: f64) -> String {
        let names = list(&self.names(branches.iter().copied()));
        let form = if branches.len() == 1 { "closes on itself" } else { "form a loop" };
        let drops = self.drops_along(branches, gap);
        let junctions = branches.iter().filter(|&&b| self.is(b, |l| matches!(l, Law::Junction(_)))).count();
        if gap == 0.0 {
            return format!(
                "{names} {form} without resistance whose voltages add up to zero, so how the current splits is open"
            );
        }
        if junctions > 0 {
            let of_drops = if junctions == 1 { "of drop" } else { "of drops" };
            return format!(
                "{names} {form} without resistance: {} drives {} {of_drops}, so the current has no limit",
                quantity(drops + gap, "V"),
                quantity(drops, "V"),
            );
        }
        let sources = branches.iter().filter(|&&b| !self.is(b, |l| matches!(l, Law::Short))).count();
        if sources == 1 {
            format!(
                "{names} {form} without resistance: {} drives a short circuit, so the current has no limit",
                quantity(gap, "V")
            )
        } else {
            format!(
                "{names} {form} without resistance, but their voltages disagree by {}",
                quantity(gap, "V")
            )
        }
    }

    fn is(&self, number: u32, test: impl Fn(&Law) -> bool) -> bool {
        self.branch(number).is_some_and(|b| test(&b.law))
    }

    /// Sum of the drops that a current along the walk overcomes. Of the two directions, the one that the gap
    /// drives.
    fn drops_along(&self, branches: &[u32], gap: f64) -> f64 {
        let mut best = (f64::INFINITY, 0.0);
        let reversed: Vec<u32> = branches.iter().rev().copied().collect();
        for walk in [branches, reversed.as_slice()] {
            let Some(first) = walk.first().and_then(|&n| self.branch(n)) else { continue };
            for start in [first.from, first.to] {
                if let Some((rise, drops)) = self.walk(walk, start) {
                    let miss = (rise - drops - gap).abs();
                    if miss < best.0 {
                        best = (miss, drops);
                    }
                }
            }
        }
        best.1
    }

    /// Rise by sources and fall by junctions along a closed walk; `None` where it does not close or a junction
    /// bars it.
    fn walk(&self, branches: &[u32], start: u32) -> Option<(f64, f64)> {
        let (mut at, mut rise, mut drops) = (start, 0.0, 0.0);
        for &number in branches {
            let branch = self.branch(number)?;
            let along = branch.from == at;
            if !along && branch.to != at {
                return None;
            }
            at = if along { branch.to } else { branch.from };
            match branch.law {
                Law::Voltage(level) => rise += if along { -level.value } else { level.value },
                Law::Junction(j) => {
                    drops +=
                        if along { j.forward.value } else { j.reverse.map_or(f64::INFINITY, |l| l.value) };
                }
                _ => {}
            }
        }
        (at == start && drops.is_finite()).then_some((rise, drops))
    }

    fn cut(&self, branches: &[u32], nodes: &[u32], excess: f64) -> String {
        let is_source = |&b: &u32| self.is(b, |l| matches!(l, Law::Current(_) | Law::CurrentControlled(..)));
        let (sources, others): (Vec<u32>, Vec<u32>) = branches.iter().copied().partition(is_source);
        let circuit = self.setting.circuit;
        let names: Vec<String> = nodes.iter().map(|&n| circuit.node_name(NodeId(n))).collect();
        let place = format!("{} {}", if nodes.len() == 1 { "node" } else { "nodes" }, list(&names));
        let other_names = list(&self.names(others.iter().copied()));
        let them = if nodes.len() == 1 { "it" } else { "them" };
        if excess == 0.0 {
            let potential =
                if nodes.len() == 1 { "its potential is open" } else { "their potentials are open together" };
            return match branches.is_empty() {
                true => format!(
                    "{place}: nothing that carries direct current joins {them} to the rest, so {potential}"
                ),
                false => format!(
                    "{place}: joined to the rest only through {}, which carry no net current, so {potential}",
                    list(&self.names(branches.iter().copied()))
                ),
            };
        }
        let source_names = self.names(sources);
        let verb = if source_names.len() == 1 { "forces" } else { "force" };
        let way = if others.is_empty() {
            "nothing else leads on".to_owned()
        } else {
            format!("{other_names} cannot carry it that way")
        };
        format!("{} {verb} {} through {place}, and {way}", list(&source_names), quantity(excess, "A"))
    }

    fn unknown(&self, branches: &[u32]) -> String {
        let names = self.names(branches.iter().copied());
        let is_or_are = if names.len() == 1 { "is" } else { "are" };
        let reason = match (names.len(), branches.first().and_then(|&b| self.assembly.owner.get(b as usize)))
        {
            (1, Some(&Owner::Element(id))) => match self.setting.circuit.element(id).behaviour {
                Behaviour::Unknown { reason } => format!(" ({reason})"),
                Behaviour::Transistor { .. } => " (a transistor that no `hold` note holds)".to_owned(),
                Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. } => {
                    " (a switch that held sources do not decide)".to_owned()
                }
                _ => String::new(),
            },
            _ => String::new(),
        };
        format!("{} {is_or_are} not modelled at the operating point{reason}", list(&names))
    }
}

/// A result that does not check.
pub(crate) fn missed(relative: f64) -> String {
    format!(
        "the result misses the circuit laws by {relative:.1e} of the largest term, more than 1e-9, and is withheld"
    )
}
