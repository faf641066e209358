//! Runs all conditions: drops in two passes, one solve for each condition, proof, and the results as plain data.

use super::assemble::{Assembly, Setting, Slots, assemble};
use super::basis::Basis;
use super::case::{Ask, case};
use super::condition::{Condition, Plan, plan};
use super::declared::{USUAL_TEMPERATURE, declared};
use super::drop::{Diode, DropLaw, diodes};
use super::reach::left_to_time;
use super::result::{Case, Operating, Why};
use super::targets::Targets;
use super::why::Reasoner;
use crate::circuit::directory::Directory;
use crate::circuit::{Behaviour, Circuit, ElementId, Overrides, Parsed, ScopeId, expand};
use crate::complementarity::{Interval, Outcome, Quantity};
use crate::config::Options;
use crate::finding::{Finding, Severity};
use crate::text::{FileId, Sources, Span};

/// A network and its answer.
pub(crate) struct Solved {
    pub assembly: Assembly,
    pub outcome: Outcome,
}

/// The text that the circuit was expanded from, to expand it again with other parameters.
#[derive(Clone, Copy)]
pub struct Text<'a> {
    /// The files.
    pub sources: &'a Sources,
    /// What they say.
    pub parsed: &'a Parsed,
}

/// Finds every diode's state in every condition. Without `text`, ranges of parameters are not known.
///
/// Drops that come from a model take two passes: the first solves nominal and the extreme instants with each such
/// diode at its 1 mA drop, the second takes the decade nearest to the greatest forward current found. Findings are
/// about names and notes that could not be used; what the states mean is for `rules`.
pub fn evaluate(circuit: &Circuit, text: Option<Text<'_>>, options: &Options) -> (Operating, Vec<Finding>) {
    let mut findings = Vec::new();
    let asks_by_name = !circuit.notes.is_empty()
        || !circuit.sweeps.is_empty()
        || !options.set.is_empty()
        || options.why.is_some();
    let directory = asks_by_name.then(|| Directory::of(circuit));
    let directory = directory.as_ref();
    let mut list = diodes(circuit, directory, options, &mut findings);
    let declared = declared(circuit, text.map(|t| t.parsed), directory, options, &mut findings);
    let plan = plan(circuit, &declared, &mut findings);
    let slots = Slots::of(circuit, &plan, &list);
    let mut run = Run {
        circuit,
        text,
        directory,
        options,
        plan: &plan,
        slots: &slots,
        twins: plan.twins(),
        first: Vec::new(),
        spent: Vec::new(),
        why: asked(circuit, directory, options, &mut findings),
        targets: Targets::of(circuit, directory),
        reasoner: Reasoner::default(),
    };
    run.first_pass(&mut list);
    let (left_to_time, nodes_left_to_time) = left_to_time(circuit, &plan);
    let mut cases = Vec::with_capacity(plan.conditions.len());
    for number in 0..plan.conditions.len() {
        let case = run.twin(&cases, number).unwrap_or_else(|| run.case(&list, number));
        cases.push(case);
    }
    let reasonings = run.reasoner.finish();
    let why = run.why.map(|element| Why { element, reasonings });
    let basis = Some(Box::new(Basis { plan, diodes: list }));
    (Operating { cases, left_to_time, nodes_left_to_time, why, basis }, findings)
}

/// The diode that `--why` asks about.
fn asked(
    circuit: &Circuit,
    directory: Option<&Directory<'_>>,
    options: &Options,
    findings: &mut Vec<Finding>,
) -> Option<ElementId> {
    let name = options.why.as_deref()?;
    let found = directory.and_then(|d| d.element(ScopeId::ROOT, name));
    let diode = found.filter(|&id| matches!(circuit.element(id).behaviour, Behaviour::Diode { .. }));
    if diode.is_none() {
        let place = circuit.title.unwrap_or(Span::new(FileId(0), 0, 0));
        let message = format!("`--why {name}` names no diode of this circuit");
        findings.push(
            Finding::new("unknown-name", Severity::Error, place, message).about(name).help(
                "Name a diode as the netlist does; inside an instance write the path, such as `X1:D3`.",
            ),
        );
    }
    diode
}

struct Run<'a> {
    circuit: &'a Circuit,
    text: Option<Text<'a>>,
    directory: Option<&'a Directory<'a>>,
    options: &'a Options,
    plan: &'a Plan,
    slots: &'a Slots,
    /// For each condition the first that asks the same.
    twins: Vec<usize>,
    /// What the first pass solved, by condition, where it still holds.
    first: Vec<Option<Solved>>,
    /// Factorizations of the first pass that were not kept, by condition.
    spent: Vec<usize>,
    /// The diode that is asked about.
    why: Option<ElementId>,
    /// Voltages whose error bars are wanted.
    targets: Targets,
    /// What was said about it.
    reasoner: Reasoner,
}

impl Run<'_> {
    fn setting<'b>(&'b self, diodes: &'b [Diode], condition: &'b Condition) -> Setting<'b> {
        Setting { circuit: self.circuit, plan: self.plan, slots: self.slots, diodes, condition }
    }

    /// Chooses the decades of drops that come from models.
    fn first_pass(&mut self, diodes: &mut [Diode]) {
        self.first = self.plan.conditions.iter().map(|_| None).collect();
        self.spent = vec![0; self.plan.conditions.len()];
        if !diodes.iter().any(|d| matches!(d.law, DropLaw::Model { .. })) {
            return;
        }
        let mut greatest: Vec<Option<f64>> = vec![None; diodes.len()];
        for (number, condition) in self.plan.conditions.iter().enumerate() {
            // ranges do not count: one drop holds over all of them
            if (number == 0 || condition.instant) && self.twins[number] == number {
                let solved = solve(&self.setting(diodes, condition));
                note_currents(&solved, diodes, &mut greatest);
                self.first[number] = Some(solved);
            }
        }
        let mut moved = false;
        for (diode, greatest) in diodes.iter_mut().zip(greatest) {
            moved |= match self.held_decade(diode.element) {
                Some(decade) => diode.take_decade(decade),
                None => diode.choose_decade(greatest),
            };
        }
        if moved {
            for (number, kept) in self.first.iter_mut().enumerate() {
                self.spent[number] = kept.take().map_or(0, |solved| solved.outcome.solves);
            }
        }
    }

    /// The decade that the options hold for a diode.
    fn held_decade(&self, diode: ElementId) -> Option<i32> {
        let held = &self.options.decades;
        if held.is_empty() {
            None
        } else {
            held.get(&self.circuit.element_name(diode).to_lowercase()).copied()
        }
    }

    /// The answer to a condition that asks what an earlier one did; where somebody asks why, all are told.
    fn twin(&self, cases: &[Case], number: usize) -> Option<Case> {
        let twin = self.twins[number];
        let name = self.plan.conditions[number].name.clone();
        (twin < number && self.why.is_none()).then(|| Case { name, ..cases[twin].clone() })
    }

    fn case(&mut self, diodes: &[Diode], number: usize) -> Case {
        let condition = &self.plan.conditions[number];
        let variant = self.variant(diodes, condition);
        let setting = match &variant {
            Some(variant) => variant.setting(self.plan, self.slots),
            None => Setting { circuit: self.circuit, plan: self.plan, slots: self.slots, diodes, condition },
        };
        let kept = self.first.get_mut(number).and_then(Option::take).filter(|_| variant.is_none());
        let solved = kept.unwrap_or_else(|| solve(&setting));
        let ask = Ask { why: self.why, targets: &self.targets, opinion: self.options.opinion };
        let mut case = case(&setting, &ask, &solved);
        case.solves += self.spent.get(number).copied().unwrap_or(0);
        if let Some(element) = self.why {
            let mut reasoner = std::mem::take(&mut self.reasoner);
            reasoner.add(&setting, &solved, &case, element);
            self.reasoner = reasoner;
        }
        case
    }

    /// The circuit of a condition in which other parameters hold, or another temperature than the text was
    /// evaluated at.
    fn variant(&self, diodes: &[Diode], condition: &Condition) -> Option<Variant> {
        let text = self.text?;
        let is_usual = condition.temperature == self.circuit.temperature.unwrap_or(USUAL_TEMPERATURE);
        if condition.parameters.is_empty() && is_usual {
            return None;
        }
        let overrides =
            Overrides { parameters: condition.parameters.clone(), temperature: Some(condition.temperature) };
        let (circuit, _) = expand(text.sources, text.parsed, &overrides);
        if circuit.elements.len() != self.circuit.elements.len() {
            return None;
        }
        let mut own = super::drop::diodes(&circuit, self.directory, self.options, &mut Vec::new());
        for (own, nominal) in own.iter_mut().zip(diodes) {
            own.hold_decade(nominal);
        }
        let condition = condition.of_variant(&circuit, &self.plan.sources);
        Some(Variant { circuit, diodes: own, condition })
    }
}

/// A circuit expanded for one condition.
struct Variant {
    circuit: Circuit,
    diodes: Vec<Diode>,
    condition: Condition,
}

impl Variant {
    fn setting<'a>(&'a self, plan: &'a Plan, slots: &'a Slots) -> Setting<'a> {
        Setting { circuit: &self.circuit, plan, slots, diodes: &self.diodes, condition: &self.condition }
    }
}

fn solve(setting: &Setting<'_>) -> Solved {
    let assembly = assemble(setting);
    let outcome = assembly.network.solve();
    Solved { assembly, outcome }
}

/// Keeps the greatest forward current of each diode; an open one counts as its upper end.
fn note_currents(solved: &Solved, diodes: &[Diode], greatest: &mut [Option<f64>]) {
    for solution in &solved.outcome.solutions {
        for (diode, greatest) in diodes.iter().zip(greatest.iter_mut()) {
            let branch = solved.assembly.branch[diode.element.index()] as usize;
            let current = match solution.currents.get(branch) {
                Some(&Quantity::Known(current)) => current,
                Some(&Quantity::Open(Interval { high, .. })) => high,
                _ => continue,
            };
            *greatest = Some(greatest.map_or(current, |g| g.max(current)));
        }
    }
}
