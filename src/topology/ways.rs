//! Where a current may go at an instant, capacitors included: what passes both ways joins its nodes to one place,
//! inductors and diodes lead from place to place. Which elements are open is for the asker to say.

use super::coupled_coils;
use super::noted::Noted;
use crate::circuit::{Behaviour, Circuit, ElementId, ModelId, NodeId};
use petgraph::unionfind::UnionFind;
use rustc_hash::{FxHashMap, FxHashSet};
use std::cell::Cell;

/// Steps of all walks together. Honest circuits come nowhere near: of the two ends of an inductor one lies in a corner of
/// the circuit, and its walk ends there.
const MOST_STEPS: usize = 50_000_000;

/// One element that leads from one place to another.
#[derive(Debug, Clone, Copy)]
struct Arc {
    element: ElementId,
    from: u32,
    to: u32,
}

/// Arcs by the place they start from.
#[derive(Debug)]
struct Outward {
    starts: Vec<u32>,
    arcs: Vec<Arc>,
}

impl Outward {
    fn of(arcs: &[Arc], places: usize) -> Self {
        let mut arcs = arcs.to_vec();
        arcs.sort_by_key(|a| (a.from, a.element));
        let mut starts = vec![0u32; places + 1];
        for arc in &arcs {
            starts[arc.from as usize + 1] += 1;
        }
        for n in 1..starts.len() {
            starts[n] += starts[n - 1];
        }
        Outward { starts, arcs }
    }

    fn at(&self, place: u32) -> &[Arc] {
        let at = |n: u32| self.starts.get(n as usize).map_or(0, |&s| s as usize);
        self.arcs.get(at(place)..at(place + 1)).unwrap_or(&[])
    }
}

/// The places of a circuit and what leads from one to another.
#[derive(Debug)]
pub struct Ways {
    onward: Outward,
    backward: Outward,
    /// The ends of every inductor that leads somewhere.
    ends: FxHashMap<ElementId, (u32, u32)>,
    left: Cell<usize>,
}

impl Ways {
    /// With the elements of `open` left out; what notes supply is joined to ground. Coupled inductors pass a current as
    /// any unknown element does.
    pub fn of(circuit: &Circuit, noted: &Noted, open: &FxHashSet<ElementId>) -> Self {
        let mut sets: UnionFind<u32> = UnionFind::new(circuit.nodes.len().max(1));
        for node in &noted.supplied {
            sets.union(NodeId::GROUND.0, node.0);
        }
        let coupled = coupled_coils(circuit);
        let mut leading = Vec::new();
        for (id, element) in circuit.elements().filter(|(id, _)| !open.contains(id)) {
            let pins = circuit.pins(id);
            let passing = match &element.behaviour {
                Behaviour::Inductor { .. } if !coupled.contains(&id) => {
                    leading.push((id, true));
                    continue;
                }
                Behaviour::Diode { model, .. } if !model.is_some_and(|m| breaks(circuit, m)) => {
                    leading.push((id, false));
                    continue;
                }
                Behaviour::CurrentSource(_) | Behaviour::Coupling { .. } => continue,
                Behaviour::VoltageByVoltage { .. }
                | Behaviour::CurrentByVoltage { .. }
                | Behaviour::VoltageSwitch { .. } => pins.get(..2).unwrap_or(pins),
                // what is not known may lead anywhere
                _ => pins,
            };
            for pair in passing.windows(2) {
                sets.union(pair[0].node.0, pair[1].node.0);
            }
        }
        Self::between(circuit, sets, &leading)
    }

    fn between(circuit: &Circuit, sets: UnionFind<u32>, leading: &[(ElementId, bool)]) -> Self {
        let places = sets.into_labeling();
        let place =
            |id: ElementId, pin: usize| places.get(circuit.node(id, pin).index()).copied().unwrap_or(0);
        let mut arcs = Vec::new();
        let mut ends = FxHashMap::default();
        for &(element, both_ways) in leading {
            let (from, to) = (place(element, 0), place(element, 1));
            if both_ways {
                ends.insert(element, (from, to));
            }
            if from != to {
                arcs.push(Arc { element, from, to });
                arcs.extend(both_ways.then_some(Arc { element, from: to, to: from }));
            }
        }
        let turned: Vec<Arc> = arcs.iter().map(|a| Arc { from: a.to, to: a.from, ..*a }).collect();
        let onward = Outward::of(&arcs, places.len());
        let backward = Outward::of(&turned, places.len());
        Ways { onward, backward, ends, left: Cell::new(MOST_STEPS) }
    }

    /// Whether a current through this inductor, either way, may close past it. Counts as so where the circuit is too
    /// tangled to tell, and for what is no inductor.
    pub fn closes(&self, coil: ElementId) -> bool {
        let Some(&(a, b)) = self.ends.get(&coil) else { return true };
        a == b || self.leads(a, b, coil) || self.leads(b, a, coil)
    }

    /// Whether a way leads from one place to another past an element. Two walks take turns, one from either end, so
    /// that the shorter decides.
    fn leads(&self, from: u32, to: u32, past: ElementId) -> bool {
        let mut walks = [Front::new(from), Front::new(to)];
        let sides = [&self.onward, &self.backward];
        loop {
            for turn in [0, 1] {
                let Some(arc) = walks[turn].next(sides[turn]) else { return false };
                let left = self.left.get();
                if left == 0 {
                    return true;
                }
                self.left.set(left - 1);
                if arc.element == past {
                    continue;
                }
                if walks[1 - turn].seen.contains(&arc.to) {
                    return true;
                }
                walks[turn].reach(arc.to);
            }
        }
    }

    /// Steps that all walks took so far.
    #[cfg(test)]
    fn steps(&self) -> usize {
        MOST_STEPS - self.left.get()
    }
}

/// Diodes of the model pass a current backwards once the voltage has risen far enough.
fn breaks(circuit: &Circuit, model: ModelId) -> bool {
    circuit.model(model).parameter("bv").is_some()
}

/// A walk that can be taken step by step.
struct Front {
    seen: FxHashSet<u32>,
    /// Places to go on from, with the number of the next arc there.
    rest: Vec<(u32, usize)>,
}

impl Front {
    fn new(start: u32) -> Self {
        Front { seen: FxHashSet::from_iter([start]), rest: vec![(start, 0)] }
    }

    fn reach(&mut self, place: u32) {
        if self.seen.insert(place) {
            self.rest.push((place, 0));
        }
    }

    fn next(&mut self, arcs: &Outward) -> Option<Arc> {
        while let Some((place, at)) = self.rest.last_mut() {
            if let Some(&arc) = arcs.at(*place).get(*at) {
                *at += 1;
                return Some(arc);
            }
            self.rest.pop();
        }
        None
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::config::Options;
    use crate::text::Memory;
    use std::path::Path;

    fn relays(count: usize, diode: &str) -> String {
        let mut text = String::from("relays on one rail\nV1 s 0 12\n.model DW D\n.model SWR SW(VT=2)\n");
        for n in 0..count {
            text += &format!("VG{n} g{n} 0 5\nL{n} s m{n} 1\nR{n} m{n} c{n} 9\nS{n} c{n} 0 g{n} 0 SWR\n");
            text += &diode.replace('#', &n.to_string());
        }
        text
    }

    fn judged(text: &str) -> (Vec<bool>, usize) {
        let mut files = Memory::with("t.cir", text);
        let circuit =
            crate::circuit::read(&mut files, Path::new("t.cir"), &Options::default()).unwrap().circuit;
        let is = |letter: u8| circuit.elements().filter(move |(_, e)| e.letter == letter).map(|(id, _)| id);
        let ways = Ways::of(&circuit, &Noted::default(), &is(b'S').collect());
        (is(b'L').map(|coil| ways.closes(coil)).collect(), ways.steps())
    }

    #[test]
    fn a_coil_closes_over_its_diode_and_over_nothing_else() {
        assert_eq!(judged(&relays(2, "D# c# s DW\n")).0, [true, true]);
        assert_eq!(judged(&relays(2, "D# s c# DW\n")).0, [true, true]); // the other way round it closes as well
        assert_eq!(judged(&relays(2, "")).0, [false, false]);
        assert_eq!(judged(&relays(2, "D# c# far# DW\n")).0, [false, false]);
    }

    #[test]
    fn many_coils_on_one_rail_take_a_few_steps_each() {
        for diode in ["D# c# s DW\n", ""] {
            let (_, steps) = judged(&relays(2000, diode));
            assert!(steps < 20 * 2000, "{steps} steps");
        }
    }
}
