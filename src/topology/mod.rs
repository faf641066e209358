//! Facts of the wiring, computed once from the flat circuit and shared by all rules: islands, loops, cut sets,
//! one-way reachability, roles of diodes. Facts only: whether one is a mistake is for `rules` to say.

use crate::circuit::Circuit;

/// The facts.
#[derive(Debug, Clone, Default)]
pub struct Wiring {}

impl Wiring {
    /// Computes all facts.
    pub fn of(circuit: &Circuit) -> Self {
        let _ = circuit;
        Wiring {}
    }
}
