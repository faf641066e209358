//! Facts of the wiring, computed once from the flat circuit and shared by all rules: which elements touch a
//! node, islands, what holds a node, loops of voltages, one-way reachability, names alike. Facts only: whether
//! one is a mistake is for `rules` to say. All in linear time and without recursion.

mod adjacent;
mod arcs;
mod blocks;
mod cuts;
mod decimal;
mod groups;
mod links;
mod loops;
mod noted;
mod ports;
mod rails;
mod similar;
mod touching;
mod walks;
mod ways;

pub use arcs::{Barred, OneWay};
pub use blocks::Unfed;
pub use cuts::{Cut, coupled_coils};
pub use decimal::{Sum, sum};
pub use groups::Groups;
pub use links::{Link, can_break_down, gives_light, is_opaque, is_sensing, links};
pub use loops::{Loop, Potentials, Step, dc_value, span_of_values, total};
pub use noted::Noted;
pub use ports::Driven;
pub use rails::Rails;
pub use similar::{Similar, is_slip, similar};
pub use touching::{Touch, Touching};
pub use walks::{Walk, is_lead, main_path};
pub use ways::Ways;

use crate::circuit::Circuit;

/// The facts.
#[derive(Debug, Clone, Default)]
pub struct Wiring {
    /// Which elements touch each node.
    pub touching: Touching,
    /// Nodes that notes name: supplied, watched, expected.
    pub noted: Noted,
    /// Nodes joined by elements of any kind that pass a current, capacitors included. Group 0 holds ground and
    /// whatever may reach it inside elements that are not known.
    pub islands: Groups,
    /// Islands that are related: by couplings, sensing inputs and control currents as well.
    pub related: Groups,
    /// Nodes joined by paths that pass a direct current. A group other than 0 is held by nothing: only
    /// capacitors, current sources, gates and sensing inputs lead out of it.
    pub held: Groups,
    /// Groups that no direct current can leave or enter but through current sources.
    pub cuts: Vec<Cut>,
    /// Closed walks of voltage sources, inductors and 0 Ω.
    pub loops: Vec<Loop>,
    /// Nodes whose differences of potential are fixed by sources alone.
    pub potentials: Potentials,
    /// What the diodes that pass current one way only make of the rest.
    pub one_way: OneWay,
    /// The same for lasting currents, which no capacitor passes.
    pub steady: OneWay,
    /// The most that the sources together can bring about between two nodes, in volts; may be without bound.
    pub available: f64,
    /// Loops in which nothing drives a current.
    pub unfed: Vec<Unfed>,
    /// Nodes that sources hold against ground.
    pub rails: Rails,
    /// Ends of what drives alternating current.
    pub driven: Vec<Driven>,
}

impl Wiring {
    /// Computes all facts.
    pub fn of(circuit: &Circuit) -> Self {
        let touching = Touching::of(circuit);
        let noted = Noted::of(circuit);
        let available = links::available_volts(circuit);
        let joints = groups::Joints::of(circuit, &noted, available);
        let (islands, related) = joints.islands_and_related(circuit);
        let held = joints.held(circuit);
        let cuts = cuts::cuts(circuit, &touching, &held, &islands);
        let potentials = Potentials::of(circuit);
        let loops = loops::loops(circuit, &potentials);
        let one_way = OneWay::of(circuit, &joints, &touching, false);
        let steady = OneWay::of(circuit, &joints, &touching, true);
        drop(joints); // what comes needs its room
        let unfed = blocks::unfed(circuit, &noted);
        let rails = Rails::of(circuit, &noted);
        let driven = ports::driven(circuit, &touching, &rails);
        Wiring {
            touching,
            noted,
            islands,
            related,
            held,
            cuts,
            loops,
            potentials,
            one_way,
            steady,
            available,
            unfed,
            rails,
            driven,
        }
    }
}
