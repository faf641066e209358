//! What the states say about each diode over all conditions, and what each rail is worth: read once for all rules that
//! judge orientation.

use super::Evidence;
use crate::circuit::{Behaviour, ElementId, NodeId, State};
use crate::operating::Operating;
use crate::swing::Swing;
use crate::topology::{Link, Walk, is_lead, is_opaque, links};
use petgraph::unionfind::UnionFind;
use rustc_hash::FxHashMap;

/// One diode over all conditions.
#[derive(Debug, Clone, Copy)]
pub struct Seen {
    /// Its state, where it is the same in every condition and every condition could judge it.
    pub always: Option<State>,
    /// Least voltage from anode to cathode that was found, volts; infinite where none was.
    pub least: f64,
    /// Greatest.
    pub greatest: f64,
    /// Greatest forward current found, amperes.
    pub current: f64,
    /// Largest magnitude of the voltage that it would see if it blocked.
    pub open_circuit: f64,
    /// Its drop in the first condition.
    pub drop: f64,
    /// Magnitude of its breakdown voltage.
    pub breakdown: Option<f64>,
}

/// What the time pass has seen of a diode.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Timed {
    /// Its state, where it is the same all the time.
    always: Option<State>,
    /// Largest voltage from cathode to anode, volts.
    reverse: f64,
}

/// What was seen of each diode that was followed.
pub fn timed(swing: &Swing) -> FxHashMap<ElementId, Timed> {
    let of = |diode: &crate::swing::DiodeSwing| {
        let time = diode.over_time.as_ref()?;
        let always = match time.states(swing.window).as_slice() {
            [one] => Some(*one),
            _ => None,
        };
        Some((diode.element, Timed { always, reverse: time.peak_reverse_voltage }))
    };
    if swing.span.is_none() { FxHashMap::default() } else { swing.diodes.iter().filter_map(of).collect() }
}

/// The whole.
#[derive(Debug, Default)]
pub struct Standing {
    diodes: FxHashMap<ElementId, Seen>,
    rails: Vec<Option<(f64, f64)>>,
    nodes: Vec<Option<(f64, f64)>>,
}

/// A drop from here on is that of a light-emitting diode: no silicon junction needs so much.
const LED: f64 = 1.2;
/// One of more is a stack of junctions that somebody sees as one diode.
const LED_AT_MOST: f64 = 4.5;

impl Seen {
    /// By its drop, it gives light.
    pub fn is_led(&self) -> bool {
        (LED..LED_AT_MOST).contains(&self.drop)
    }

    /// Joins what time has shown to what the conditions have.
    fn follow(&mut self, timed: Option<Timed>) {
        let Some(timed) = timed else {
            self.always = None;
            return;
        };
        if self.always != timed.always {
            self.always = None;
        }
        self.least = self.least.min(-timed.reverse);
        if timed.always == Some(State::Blocking) {
            self.greatest = self.greatest.max(0.0);
        }
    }

    /// It is the same state in every condition.
    pub fn is_always(&self, state: State) -> bool {
        self.always == Some(state)
    }

    /// Its breakdown voltage is in the range of a Zener or surge diode for these volts, not of a rectifier.
    pub fn clamps_near(&self, volts: f64) -> bool {
        !self.is_led() && self.breakdown.is_some_and(|bv| bv <= 2.2 * volts.abs())
    }
}

impl Standing {
    /// Reads all conditions.
    pub fn of(evidence: &Evidence<'_>, operating: &Operating) -> Self {
        let mut standing = Standing { diodes: FxHashMap::default(), rails: Vec::new(), nodes: Vec::new() };
        standing.rails.resize(evidence.circuit.nodes.len().max(1), None);
        standing.nodes.resize(evidence.circuit.nodes.len().max(1), None);
        for case in &operating.cases {
            let value = |id: ElementId| {
                case.sources
                    .binary_search_by_key(&id, |s| s.0)
                    .ok()
                    .and_then(|at| case.sources.get(at))
                    .map(|s| s.1)
            };
            let supply = |node: NodeId| case.supplies.iter().find(|s| s.0 == node).map(|s| s.1);
            let volts = evidence.wiring.rails.potentials(value, supply);
            for (known, volts) in standing.rails.iter_mut().zip(volts) {
                widen(known, volts);
            }
            widen(&mut standing.nodes[0], Some(0.0));
            for node in case.solutions.first().into_iter().flat_map(|s| &s.nodes) {
                widen(&mut standing.nodes[node.node.index()], node.voltage.known());
            }
            for diode in case.solutions.iter().flat_map(|s| &s.diodes) {
                if case.instant && operating.left_to_time.binary_search(&diode.element).is_ok() {
                    continue;
                }
                let fresh = Seen {
                    always: Some(diode.state),
                    least: f64::INFINITY,
                    greatest: f64::NEG_INFINITY,
                    current: 0.0,
                    open_circuit: 0.0,
                    drop: diode.drop.volts,
                    breakdown: diode.breakdown,
                };
                let seen = standing.diodes.entry(diode.element).or_insert(fresh);
                if seen.always != Some(diode.state) {
                    seen.always = None;
                }
                if let Some(v) = diode.voltage.known() {
                    (seen.least, seen.greatest) = (seen.least.min(v), seen.greatest.max(v));
                }
                seen.current = seen.current.max(diode.current.known().unwrap_or(0.0));
                let view = diode.view.map_or(0.0, |v| v.open_circuit.abs());
                seen.open_circuit = seen.open_circuit.max(view);
            }
        }
        // a condition without an answer, and one that time must judge and did not, leave nothing certain
        let hopeless = operating.cases.iter().any(|case| case.solutions.is_empty());
        for (id, seen) in &mut standing.diodes {
            let is_timed = operating.left_to_time.binary_search(id).is_ok();
            if hopeless || matches!(seen.always, Some(State::NotEvaluated | State::Open)) {
                seen.always = None;
            } else if is_timed {
                seen.follow(evidence.timed(*id));
            }
        }
        standing
    }

    /// The greatest magnitude of any rail over all conditions, in volts.
    pub fn greatest_rail(&self) -> f64 {
        self.rails.iter().flatten().map(|(low, high)| low.abs().max(high.abs())).fold(0.0, f64::max)
    }

    /// What was seen of a diode.
    pub fn diode(&self, id: ElementId) -> Option<&Seen> {
        self.diodes.get(&id)
    }

    /// Least and greatest volts of any node in the conditions in which they are known.
    pub fn node(&self, node: NodeId) -> Option<(f64, f64)> {
        *self.nodes.get(node.index())?
    }

    /// Least and greatest volts of a rail over all conditions; `None` for other nodes.
    pub fn rail(&self, node: NodeId) -> Option<(f64, f64)> {
        *self.rails.get(node.index())?
    }
}

fn widen(known: &mut Option<(f64, f64)>, volts: Option<f64>) {
    if let Some(v) = volts {
        *known = Some(known.map_or((v, v), |(low, high)| (low.min(v), high.max(v))));
    }
}

/// Nodes between rails, joined by what passes a direct current, some diodes left out.
pub struct Regions {
    of: Vec<u32>,
    /// Something inside drives a current, or is not known.
    fed: Vec<bool>,
    /// Rails that it touches, by the number of its first node.
    borders: FxHashMap<u32, Vec<NodeId>>,
}

impl Regions {
    /// Without the diodes that `is_out` picks.
    pub fn of(evidence: &Evidence<'_>, is_out: impl Fn(ElementId) -> bool) -> Self {
        let circuit = evidence.circuit;
        let rails = &evidence.wiring.rails;
        let count = circuit.nodes.len().max(1);
        let mut sets = UnionFind::<u32>::new(count);
        let joins = || {
            circuit
                .elements()
                .filter(|(id, e)| !(matches!(e.behaviour, Behaviour::Diode { .. }) && is_out(*id)))
        };
        for (id, _) in joins() {
            for (a, b, link) in links(circuit, id) {
                let (a, b) = (circuit.node(id, a), circuit.node(id, b));
                if link == Link::Direct && !rails.is_rail(a) && !rails.is_rail(b) {
                    sets.union(a.0, b.0);
                }
            }
        }
        let mut regions =
            Regions { of: sets.into_labeling(), fed: vec![false; count], borders: FxHashMap::default() };
        for (id, element) in joins() {
            let drives = is_opaque(circuit, id)
                || matches!(
                    element.behaviour,
                    Behaviour::CurrentSource(_)
                        | Behaviour::CurrentByVoltage { .. }
                        | Behaviour::CurrentByCurrent { .. }
                        | Behaviour::VoltageSource(_)
                        | Behaviour::VoltageByVoltage { .. }
                        | Behaviour::VoltageByCurrent { .. }
                )
                || evidence.is_coupled(id);
            for (a, b, link) in links(circuit, id) {
                let ends = [circuit.node(id, a), circuit.node(id, b)];
                for (node, other) in [(ends[0], ends[1]), (ends[1], ends[0])] {
                    if rails.is_rail(node) || link == Link::Capacitive {
                        continue;
                    }
                    let region = regions.of[node.index()];
                    regions.fed[region as usize] |= drives;
                    if rails.is_rail(other) && link == Link::Direct {
                        regions.borders.entry(region).or_default().push(other);
                    }
                }
            }
        }
        regions
    }

    /// Number of a node's region; rails have none of their own.
    pub fn region(&self, node: NodeId) -> u32 {
        self.of[node.index()]
    }

    /// Nothing inside drives a current.
    pub fn is_still(&self, region: u32) -> bool {
        !self.fed[region as usize]
    }

    /// The rails around it.
    pub fn borders(&self, region: u32) -> &[NodeId] {
        self.borders.get(&region).map_or(&[], Vec::as_slice)
    }

    /// Nothing inside drives a current, and the only rail around it is ground: no current flows in it.
    pub fn is_unfed(&self, region: u32) -> bool {
        self.is_still(region) && self.borders(region).iter().all(|&b| b == NodeId::GROUND)
    }
}

/// What stands behind one end of a diode: the walk outwards through resistors and inductors in series.
pub fn behind(evidence: &Evidence<'_>, diode: ElementId, pin: usize) -> Walk {
    let circuit = evidence.circuit;
    evidence.wiring.touching.walk(circuit, &evidence.wiring.rails, circuit.node(diode, pin), diode, is_lead)
}
