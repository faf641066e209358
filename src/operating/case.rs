//! One condition's answer as plain data: proof first, then diodes, nodes and branches by name.

use super::assemble::{Assembly, NONE, Owner, Setting};
use super::drop::Diode;
use super::evaluate::Solved;
use super::opinion::{MOST_DIODES, Opinion, opinion};
use super::proof::{Claim, Proof, claims_solution, prove};
use super::result::{BranchResult, Case, Cause, DifferenceOf, DiodeResult, NodeResult, Residual, Solution};
use super::targets::{Targets, between_pinned, differences};
use super::trust::Judge;
use super::view::margin;
use super::words::{causes, missed, openings};
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::complementarity::{self, Outcome, Place, Quantity, Questions, Spread, Verdict, View};
use crate::config::SecondOpinion;
use rustc_hash::FxHashSet;

/// Largest number of diodes in a part for which every view is computed.
const MOST_VIEWS: usize = 3000;

/// What is wanted beyond the states.
pub(crate) struct Ask<'a> {
    /// The diode that is asked about: its view is computed in parts of any size.
    pub why: Option<ElementId>,
    /// Voltages whose error bars are wanted.
    pub targets: &'a Targets,
    /// Where the second opinion is sought.
    pub opinion: SecondOpinion,
}

/// Builds the case.
pub(crate) fn case(setting: &Setting<'_>, ask: &Ask<'_>, solved: &Solved) -> Case {
    let parts = Parts::of(setting, &solved.assembly, &solved.outcome);
    let (residual, withheld) = check(setting, solved, &parts);
    let outcome = &solved.outcome;
    let (verdict, causes) = judged(setting, solved, &withheld);
    let maker = Maker { setting, ask, solved, parts: &parts, withheld: &withheld };
    let solutions = if withheld.whole.is_some() {
        Vec::new()
    } else {
        outcome.solutions.iter().map(|s| maker.solution(s)).collect()
    };
    let condition = setting.condition;
    let supplies = setting.plan.supplies.iter().zip(&condition.supplies);
    Case {
        name: condition.name.clone(),
        sources: setting.plan.sources.iter().zip(&condition.sources).map(|(&id, l)| (id, l.value)).collect(),
        supplies: supplies.map(|(supply, level)| (supply.node, level.value)).collect(),
        instant: condition.instant,
        temperature: condition.temperature,
        verdict,
        causes,
        truncated: outcome.truncated || outcome.parts.iter().any(|p| p.truncated),
        solves: outcome.solves,
        residual,
        solutions,
    }
}

/// The verdict of the whole, and what makes it other than unique, each cause once.
fn judged(setting: &Setting<'_>, solved: &Solved, withheld: &Withheld) -> (Verdict, Vec<Cause>) {
    let (assembly, outcome) = (&solved.assembly, &solved.outcome);
    let mut found: Vec<Cause> = Vec::new();
    let mut verdict = outcome.verdict;
    for (part, miss) in outcome.parts.iter().zip(&withheld.parts) {
        if let Some(relative) = miss {
            verdict = Verdict::Unverified;
            found.push(withheld.cause(part, assembly, *relative));
        } else if part.verdict != Verdict::Unique {
            let told = causes(setting, assembly, part);
            match outcome.solutions.first() {
                Some(solution) if told.is_empty() => {
                    found.extend(openings(setting, assembly, part, solution));
                }
                _ => found.extend(told),
            }
        }
    }
    if let Some(relative) = withheld.whole {
        verdict = Verdict::Unverified;
        found.push(Cause {
            verdict,
            text: missed(relative),
            elements: withheld.elements.clone(),
            left_to_time: false,
        });
    }
    let mut told = FxHashSet::default();
    // one cause may spoil several parts
    found.retain(|c| told.insert((c.text.clone(), c.elements.clone())));
    for cause in &mut found {
        cause.left_to_time = is_left_to_time(setting, cause);
    }
    (verdict, found)
}

/// Whether a moving source meets an inductor in this loop, in one of its extreme instants or, having no DC value,
/// at time zero; or a transistor or switch that is held on does, as in a converter, where it is so for a moment only.
fn is_left_to_time(setting: &Setting<'_>, cause: &Cause) -> bool {
    let has = |wanted: fn(&Behaviour) -> bool| {
        cause.elements.iter().any(|&id| wanted(&setting.circuit.element(id).behaviour))
    };
    let moves = |behaviour: &Behaviour| match behaviour {
        Behaviour::VoltageSource(source) => source.shape.is_some() && source.dc.is_none(),
        Behaviour::Transistor { .. } | Behaviour::VoltageSwitch { .. } | Behaviour::CurrentSwitch { .. } => {
            true
        }
        _ => false,
    };
    cause.verdict == Verdict::None
        && has(|b| matches!(b, Behaviour::Inductor { .. }))
        && (setting.condition.instant || has(moves))
}

/// Which part each branch and node belongs to, and how many diodes each has.
struct Parts {
    of_branch: Vec<u32>,
    of_node: Vec<u32>,
    diodes: Vec<usize>,
    /// Why a part's diodes are not evaluated, where they are not.
    reasons: Vec<Option<String>>,
}

impl Parts {
    fn of(setting: &Setting<'_>, assembly: &Assembly, outcome: &Outcome) -> Self {
        let mut parts = Parts {
            of_branch: vec![NONE; assembly.owner.len()],
            of_node: vec![NONE; setting.circuit.nodes.len().max(1)],
            diodes: vec![0; outcome.parts.len()],
            reasons: outcome.parts.iter().map(|p| reason(setting, assembly, p)).collect(),
        };
        for (n, part) in outcome.parts.iter().enumerate() {
            for &branch in &part.branches {
                if let Some(slot) = parts.of_branch.get_mut(branch as usize) {
                    *slot = n as u32;
                }
            }
            for &node in &part.nodes {
                if let Some(slot) = parts.of_node.get_mut(node as usize) {
                    *slot = n as u32;
                }
            }
        }
        for diode in setting.diodes {
            let branch = assembly.branch[diode.element.index()] as usize;
            if let Some(&part) = parts.of_branch.get(branch)
                && let Some(count) = parts.diodes.get_mut(part as usize)
            {
                *count += 1;
            }
        }
        parts
    }

    fn branch(&self, number: usize) -> Option<usize> {
        self.of_branch.get(number).filter(|&&p| p != NONE).map(|&p| p as usize)
    }

    fn node(&self, node: NodeId) -> Option<usize> {
        self.of_node.get(node.index()).filter(|&&p| p != NONE).map(|&p| p as usize)
    }
}

/// Why nothing of a part could be reached, in a few words; `None` where it could.
fn reason(setting: &Setting<'_>, assembly: &Assembly, part: &complementarity::Part) -> Option<String> {
    if claims_solution(part.verdict) {
        return None;
    }
    let texts: Vec<String> = causes(setting, assembly, part).into_iter().map(|c| c.text).collect();
    Some(match texts.is_empty() {
        false => texts.join("; "),
        true if part.verdict == Verdict::None => "it hangs on nodes that contradictory sources hold".into(),
        true => format!("its part has the verdict {}", part.verdict.word()),
    })
}

/// What the proof took away.
struct Withheld {
    /// For each part the relative miss that rules it out.
    parts: Vec<Option<f64>>,
    /// A miss that no part can be blamed for.
    whole: Option<f64>,
    /// Elements whose laws are missed.
    elements: Vec<ElementId>,
}

impl Withheld {
    fn cause(&self, part: &complementarity::Part, assembly: &Assembly, relative: f64) -> Cause {
        let of_part = |id: &&ElementId| part.branches.contains(&assembly.branch[id.index()]);
        let elements = self.elements.iter().filter(of_part).take(MOST_BLAMED).copied().collect();
        Cause { verdict: Verdict::Unverified, text: missed(relative), elements, left_to_time: false }
    }
}

/// Most elements that one missed law names.
const MOST_BLAMED: usize = 16;

/// Proves every solution, and says which parts do not stand.
fn check(setting: &Setting<'_>, solved: &Solved, parts: &Parts) -> (Residual, Withheld) {
    let mut residual = Residual::default();
    let mut withheld =
        Withheld { parts: vec![None; solved.outcome.parts.len()], whole: None, elements: Vec::new() };
    for solution in &solved.outcome.solutions {
        let proof = prove_one(setting, solved, solution);
        residual.current = residual.current.max(proof.residual.current);
        residual.voltage = residual.voltage.max(proof.residual.voltage);
        residual.relative = residual.relative.max(proof.residual.relative);
        for (id, relative) in proof.misses {
            let branch = solved.assembly.branch[id.index()] as usize;
            let blamed = match parts.branch(branch) {
                Some(part) => &mut withheld.parts[part],
                None => &mut withheld.whole,
            };
            // a miss that is not a number is the worst
            *blamed =
                Some(blamed.map_or(relative, |worst: f64| if worst >= relative { worst } else { relative }));
            if withheld.elements.len() < 4 * MOST_BLAMED {
                withheld.elements.push(id);
            }
        }
        unfinished(solved, solution, &mut withheld);
    }
    (residual, withheld)
}

fn prove_one(setting: &Setting<'_>, solved: &Solved, solution: &complementarity::Solution) -> Proof {
    let (potentials, currents) = &solution.sample;
    let owners = solved.assembly.owner.iter().zip(currents);
    let supplies: Vec<f64> = owners.filter(|(o, _)| matches!(o, Owner::Supply(_))).map(|(_, &i)| i).collect();
    let claim = Claim {
        potentials,
        currents,
        places: &solution.places,
        branch: &solved.assembly.branch,
        supplies: &supplies,
    };
    prove(setting, &solved.outcome, &claim)
}

/// A part that claims to be solved has a number everywhere.
fn unfinished(solved: &Solved, solution: &complementarity::Solution, withheld: &mut Withheld) {
    let (potentials, currents) = &solution.sample;
    for (part, miss) in solved.outcome.parts.iter().zip(&mut withheld.parts) {
        let finite = |list: &[f64], at: u32| list.get(at as usize).is_some_and(|v| v.is_finite());
        let whole = part.nodes.iter().all(|&n| finite(potentials, n))
            && part.branches.iter().all(|&b| finite(currents, b));
        if claims_solution(part.verdict) && !whole {
            *miss = Some(f64::INFINITY);
        }
    }
}

/// What was seen, by diode and by pair.
struct CaseLooks {
    views: Vec<Option<View>>,
    spreads: Vec<Option<Spread>>,
    pairs: Vec<Option<f64>>,
}

struct Maker<'a> {
    setting: &'a Setting<'a>,
    ask: &'a Ask<'a>,
    solved: &'a Solved,
    parts: &'a Parts,
    withheld: &'a Withheld,
}

impl Maker<'_> {
    fn is_withheld(&self, part: Option<usize>) -> bool {
        part.is_some_and(|p| self.withheld.parts[p].is_some())
    }

    fn is_partial(&self, part: Option<usize>) -> bool {
        part.is_some_and(|p| self.solved.outcome.parts[p].verdict == Verdict::Partial)
    }

    fn solution(&self, solution: &complementarity::Solution) -> Solution {
        let circuit = self.setting.circuit;
        let pairs = self.pairs(solution);
        let looks = self.looks(solution, &pairs);
        let judge = Judge { setting: self.setting, assembly: &self.solved.assembly, solution };
        let opinion = self.opinion(solution);
        let mut diodes = Vec::with_capacity(self.setting.diodes.len());
        for (n, diode) in self.setting.diodes.iter().enumerate() {
            let mut result = self.diode(solution, diode, looks.views[n]);
            if self.ask.opinion != SecondOpinion::Nowhere {
                judge.judge(&mut result, diode, looks.spreads[n]);
                result.refined = opinion.diodes.get(n).copied().flatten();
            }
            diodes.push(result);
        }
        let refined = |node: NodeId| opinion.nodes.get(node.index()).copied().filter(|v| v.is_finite());
        let targets = &self.ask.targets.nodes;
        let nodes = (1..circuit.nodes.len()).map(NodeId::new).map(|node| {
            let known = solution.potentials.get(node.index()).copied().unwrap_or(Quantity::Unknown);
            let voltage = if self.is_withheld(self.parts.node(node)) { Quantity::Unknown } else { known };
            let at = targets.binary_search(&node).ok();
            let error = at.and_then(|n| looks.pairs[n]).filter(|_| voltage.known().is_some());
            NodeResult { node, voltage, error, refined: refined(node) }
        });
        let nodes: Vec<NodeResult> = nodes.collect();
        let differences = differences(&pairs[targets.len()..], &looks.pairs[targets.len()..], &nodes);
        Solution { diodes, nodes, branches: self.branches(solution), differences, unrefined: opinion.failed }
    }

    /// Watched nodes against ground, then the differences that matter in this solution.
    fn pairs(&self, solution: &complementarity::Solution) -> Vec<(NodeId, NodeId, DifferenceOf)> {
        if self.ask.opinion == SecondOpinion::Nowhere {
            let nodes = self.ask.targets.nodes.iter();
            return nodes.map(|&n| (n, NodeId::GROUND, DifferenceOf::Watched)).collect();
        }
        let targets = self.ask.targets;
        let mut pairs: Vec<_> =
            targets.nodes.iter().map(|&n| (n, NodeId::GROUND, DifferenceOf::Watched)).collect();
        pairs.extend(&targets.pairs);
        pairs.extend(between_pinned(self.setting, &self.solved.assembly, solution));
        pairs
    }

    fn opinion(&self, solution: &complementarity::Solution) -> Opinion {
        let most = match self.ask.opinion {
            SecondOpinion::Nowhere => return Opinion::default(),
            SecondOpinion::Usual => MOST_DIODES,
            SecondOpinion::Everywhere => usize::MAX,
        };
        let is_sought = |branch: u32| {
            self.parts.branch(branch as usize).is_some_and(|p| {
                let is_settled = matches!(
                    self.solved.outcome.parts[p].verdict,
                    Verdict::Unique | Verdict::Shared | Verdict::Floating | Verdict::SharedFloating
                );
                is_settled && self.withheld.parts[p].is_none() && self.parts.diodes[p] <= most
            })
        };
        opinion(self.setting, self.solved, solution, is_sought)
    }

    fn branches(&self, solution: &complementarity::Solution) -> Vec<BranchResult> {
        let shown = |b: &Behaviour| {
            matches!(
                b,
                Behaviour::Resistor(_)
                    | Behaviour::Inductor { .. }
                    | Behaviour::VoltageSource(_)
                    | Behaviour::CurrentSource(_)
                    | Behaviour::VoltageByVoltage { .. }
                    | Behaviour::CurrentByVoltage { .. }
                    | Behaviour::VoltageByCurrent { .. }
                    | Behaviour::CurrentByCurrent { .. }
            )
        };
        let elements = self.setting.circuit.elements().filter(|(_, e)| shown(&e.behaviour));
        let result = |element: ElementId| {
            let branch = self.solved.assembly.branch[element.index()] as usize;
            let current = solution.currents.get(branch).copied()?;
            let is_out = current == Quantity::Unknown || self.is_withheld(self.parts.branch(branch));
            (!is_out).then_some(BranchResult { element, current })
        };
        elements.filter_map(|(id, _)| result(id)).collect()
    }

    /// A view and a spread for each diode, where its part is small enough or somebody asks, and the spreads of the
    /// voltages wanted.
    fn looks(
        &self,
        solution: &complementarity::Solution,
        pairs: &[(NodeId, NodeId, DifferenceOf)],
    ) -> CaseLooks {
        let mut wanted = Vec::new();
        let mut at = Vec::new();
        for (n, diode) in self.setting.diodes.iter().enumerate() {
            let branch = self.solved.assembly.branch[diode.element.index()];
            let part = self.parts.branch(branch as usize);
            let is_small = part.is_none_or(|p| self.parts.diodes[p] <= MOST_VIEWS);
            if !self.is_withheld(part) && (is_small || self.ask.why == Some(diode.element)) {
                wanted.push(branch);
                at.push(n);
            }
        }
        let judge = Judge { setting: self.setting, assembly: &self.solved.assembly, solution };
        let is_judged = self.ask.opinion != SecondOpinion::Nowhere;
        let nodes: Vec<(u32, u32)> = pairs.iter().map(|&(p, q, _)| (p.0, q.0)).collect();
        let looked = self.solved.assembly.network.look(
            solution,
            &Questions {
                junctions: &wanted,
                spreads: is_judged,
                pairs: if is_judged { &nodes } else { &[] },
                doubt: &|branch, view, more| judge.doubt(branch, view, more),
            },
        );
        let count = self.setting.diodes.len();
        let mut looks = CaseLooks {
            views: vec![None; count],
            spreads: vec![None; count],
            pairs: looked.pairs.iter().map(|p| p.map(|s| s.total)).collect(),
        };
        looks.pairs.resize(pairs.len(), None);
        for ((n, view), spread) in at.into_iter().zip(looked.views).zip(looked.spreads) {
            looks.views[n] = view;
            looks.spreads[n] = spread;
        }
        looks
    }

    fn diode(&self, solution: &complementarity::Solution, diode: &Diode, view: Option<View>) -> DiodeResult {
        let branch = self.solved.assembly.branch[diode.element.index()] as usize;
        let part = self.parts.branch(branch);
        let is_withheld = self.is_withheld(part);
        let place = match solution.places.get(branch) {
            Some(&place) if !is_withheld => place,
            _ => Place::Unknown,
        };
        let pick = |list: &[Quantity]| match place {
            Place::Unknown => Quantity::Unknown,
            _ => list.get(branch).copied().unwrap_or(Quantity::Unknown),
        };
        let (voltage, current) = (pick(&solution.voltages), pick(&solution.currents));
        let drop = diode.drop(self.setting.circuit, self.setting.condition.temperature);
        let breakdown = diode.reverse.map(|l| l.value);
        let power = voltage.known().zip(current.known()).map(|(v, i)| v * i);
        let view = view.filter(|v| v.open_circuit.is_finite() && v.resistance.is_finite());
        DiodeResult {
            element: diode.element,
            state: state(place),
            not_evaluated: (place == Place::Unknown).then(|| self.reason(part, is_withheld)),
            unmodelled: place == Place::Unknown && !is_withheld && self.is_partial(part),
            voltage,
            current,
            power,
            margin: view.and_then(|v| margin(v, place, drop.volts, breakdown)),
            drop,
            breakdown,
            series: diode.series,
            view,
            knee: None,
            trust: None,
            trust_reasons: Vec::new(),
            error: None,
            refined: None,
        }
    }

    fn reason(&self, part: Option<usize>, is_withheld: bool) -> String {
        match part.and_then(|p| self.parts.reasons[p].clone()) {
            _ if is_withheld => "the result of its part does not check".into(),
            Some(reason) => reason,
            None => "it is in no part that was solved".into(),
        }
    }
}

pub(crate) fn state(place: Place) -> State {
    match place {
        Place::Conducting => State::Conducting,
        Place::Blocking => State::Blocking,
        Place::Breakdown => State::Breakdown,
        Place::Open => State::Open,
        Place::Unknown => State::NotEvaluated,
    }
}
