//! Puts the time pass together: parts, their equations, their walks, and the figures in the order of the circuit.

use super::conditions::over_conditions;
use super::equations::equations;
use super::inputs::Given;
use super::parts::{PartList, parts};
use super::result::{DiodeSwing, Effort, Level, NodeSwing, Swing, Wave};
use super::run::{Failed, Pass, Ran, run};
use super::timing::Timing;
use crate::circuit::{Behaviour, Circuit, NodeId};
use crate::config::Options;
use crate::operating::{Basis, Operating};
use crate::topology::Noted;

/// Work that one run of `check` spends on the time pass of one file, in multiplications.
const WORK: u64 = 600_000_000;

const SPENT: &str = "the work that was allowed was spent on other parts";

/// Most waveforms that are kept.
const MOST_WAVES: usize = 8;

/// What moves over the conditions and, where sources move, over time.
pub fn follow(circuit: &Circuit, operating: &Operating, noted: &Noted, options: &Options) -> Swing {
    let mut ranges = over_conditions(operating);
    let diodes = circuit.elements().filter(|(_, e)| matches!(e.behaviour, Behaviour::Diode { .. }));
    let mut swing = Swing {
        diodes: diodes
            .map(|(element, _)| DiodeSwing {
                element,
                over_time: None,
                not_evaluated: None,
                over_conditions: ranges.remove(&element),
            })
            .collect(),
        nodes: (1..circuit.nodes.len())
            .map(|n| NodeSwing { node: NodeId::new(n), over_time: None })
            .collect(),
        ..Swing::default()
    };
    if let Some(basis) = operating.basis.as_deref().filter(|basis| moves(circuit, basis)) {
        over_time(circuit, basis, noted, options, &mut swing);
    }
    swing
}

/// Whether anything moves: a source, or what initial conditions let go within a span that is asked for.
fn moves(circuit: &Circuit, basis: &Basis) -> bool {
    let has_initial = |b: &Behaviour| {
        matches!(
            b,
            Behaviour::Capacitor { initial: Some(_), .. } | Behaviour::Inductor { initial: Some(_), .. }
        )
    };
    !basis.plan.moving.is_empty()
        || circuit.transient.is_some_and(|t| {
            t.uic || !circuit.initial.is_empty() || circuit.elements.iter().any(|e| has_initial(&e.behaviour))
        })
}

fn over_time(circuit: &Circuit, basis: &Basis, noted: &Noted, options: &Options, swing: &mut Swing) {
    let given = Given::new(circuit, basis);
    let timing = Timing::new(&given.shapes, circuit.transient);
    let all = parts(circuit, &given);
    let (from, to) = timing.window;
    swing.span = Some(to - timing.first);
    swing.period = timing.period;
    (swing.start, swing.window) = (from, to - from);
    swing.periodic = timing.period.is_some();
    let monitor = &options.monitor;
    let is_cancelled = || monitor.is_cancelled();
    let total = WORK.saturating_mul(u64::from(options.patience.max(1)));
    let mut pass = Pass { circuit, given: &given, timing, budget: total, is_cancelled: &is_cancelled };
    let shown = Shown::of(circuit, noted);
    pass.budget = total / 4;
    let mut left = total.saturating_sub(held_nodes(&pass, &shown, swing));
    for (n, part) in all.iter().enumerate() {
        monitor.report((1000 * n / all.len()) as u32);
        if left == 0 {
            give_up(part, SPENT, swing);
            swing.cut_short.get_or_insert_with(|| SPENT.to_owned());
            continue;
        }
        // what parts leave unused is for the rest, and as long as there is any, a part gets enough to begin with
        pass.budget = (left / (all.len() - n).clamp(1, 8) as u64).max(left.min(total / 1000));
        left = left.saturating_sub(one_part(&pass, basis, &shown, part, swing));
    }
    monitor.report(1000);
    if is_cancelled() {
        swing.cut_short = Some("the run was ended before everything was followed".into());
        swing.periodic = false;
    }
    swing.waves.sort_by_key(|w| w.node);
    swing.waves.truncate(MOST_WAVES);
}

/// Follows one part and enters its figures; gives the work that it took.
fn one_part(pass: &Pass<'_>, basis: &Basis, shown: &Shown, part: &PartList, swing: &mut Swing) -> u64 {
    let written = equations(pass.circuit, basis, pass.given, part).map_err(Failed::from);
    let followed = written.and_then(|equations| {
        let watched = shown.places(part);
        let nodes: Vec<NodeId> = watched.iter().map(|&n| part.nodes[n]).collect();
        let ran = run(pass, &equations, watched)?;
        Ok((equations.diodes, nodes, ran))
    });
    match followed {
        Err(Failed { reason, work }) => {
            give_up(part, &reason, swing);
            work
        }
        Ok((diodes, watched, ran)) => {
            let work = ran.work;
            for (&id, figures) in diodes.iter().zip(&ran.diodes) {
                if let Ok(at) = swing.diodes.binary_search_by_key(&id, |d| d.element) {
                    swing.diodes[at].over_time = Some(figures.clone());
                }
            }
            enter(part, &watched, ran, swing);
            work
        }
    }
}

/// Enters why a part was not followed; whether the others come back is theirs to say.
fn give_up(part: &PartList, reason: &str, swing: &mut Swing) {
    for id in &part.elements {
        if let Ok(at) = swing.diodes.binary_search_by_key(id, |d| d.element) {
            swing.diodes[at].not_evaluated = Some(reason.to_owned());
        }
    }
}

/// Nodes whose waveforms are kept: those that notes watch, else some where a diode meets a capacitor.
struct Shown(Vec<NodeId>);

impl Shown {
    fn of(circuit: &Circuit, noted: &Noted) -> Self {
        if !noted.watched.is_empty() {
            return Shown(noted.watched.clone());
        }
        let touched = |wanted: fn(&Behaviour) -> bool| -> Vec<NodeId> {
            let elements = circuit.elements().filter(|(_, e)| wanted(&e.behaviour));
            elements.flat_map(|(id, _)| circuit.pins(id)).map(|p| p.node).collect()
        };
        let mut stored = touched(|b| matches!(b, Behaviour::Capacitor { .. }));
        stored.sort();
        let mut nodes = touched(|b| matches!(b, Behaviour::Diode { .. }));
        nodes.retain(|n| *n != NodeId::GROUND && stored.binary_search(n).is_ok());
        nodes.sort();
        nodes.dedup();
        nodes.truncate(MOST_UNASKED);
        Shown(nodes)
    }

    /// Places of these among the nodes of a part.
    fn places(&self, part: &PartList) -> Vec<usize> {
        let is_shown = |n: &usize| self.0.binary_search(&part.nodes[*n]).is_ok();
        (0..part.nodes.len()).filter(is_shown).take(MOST_WAVES).collect()
    }
}

/// Waveforms of nodes that nobody asked for, at most.
const MOST_UNASKED: usize = 3;

fn enter(part: &PartList, watched: &[NodeId], ran: Ran, swing: &mut Swing) {
    for (&node, level) in part.nodes.iter().zip(&ran.nodes) {
        if let Some(slot) = swing.nodes.get_mut(node.index() - 1) {
            slot.over_time = finite(*level);
        }
    }
    swing.waves.extend(watched.iter().zip(ran.waves).map(|(&node, points)| Wave { node, points }));
    swing.periodic &= ran.periodic;
    if swing.cut_short.is_none() {
        swing.cut_short = ran.cut_short;
    }
    let Effort { steps, rejected, factorizations, periods, window_steps, window_factorizations } = ran.effort;
    let effort = &mut swing.effort;
    effort.steps += steps;
    effort.rejected += rejected;
    effort.factorizations += factorizations;
    effort.periods = effort.periods.max(periods);
    effort.window_steps += window_steps;
    effort.window_factorizations += window_factorizations;
}

fn finite(level: Level) -> Option<Level> {
    (level.mean.is_finite() && level.min.is_finite() && level.max.is_finite()).then_some(level)
}

/// Nodes that sources hold: their courses are given. Gives the work that it took.
fn held_nodes(pass: &Pass<'_>, shown: &Shown, swing: &mut Swing) -> u64 {
    let nodes: Vec<NodeId> =
        (1..pass.given.held.len()).filter(|&n| pass.given.held[n].is_some()).map(NodeId::new).collect();
    if nodes.is_empty() {
        return 0;
    }
    let part = PartList { elements: Vec::new(), nodes };
    let given = super::equations::held(pass.given, &part);
    let watched = shown.places(&part);
    let names: Vec<NodeId> = watched.iter().map(|&n| part.nodes[n]).collect();
    match run(pass, &given, watched) {
        Ok(mut ran) => {
            let work = ran.work;
            ran.effort = Effort::default();
            // what is given repeats itself as the sources do
            ran.periodic = true;
            enter(&part, &names, ran, swing);
            work
        }
        Err(failed) => failed.work,
    }
}
