//! Every solution of a small network, found from the definitions alone and in exact rational arithmetic: each
//! assignment of states is tried, and what the laws then leave is described by its corners and directions.
//! Independent of the library under test: it sees only the made-up circuit, never the netlist or kneewise.
//!
//! Readings of the definitions where words leave room:
//! - The solution set is the union over all assignments of the polyhedron {conducting: u = drop, i ≥ 0; blocking:
//!   i = 0, −BV ≤ u ≤ drop; breakdown: u = −BV, i ≤ 0}, u the voltage without the series resistance.
//! - "Current that merely circulates in a loop of forward arcs with total voltage zero": a directed loop of arcs
//!   none of which has a voltage: diodes without drop and series resistance, sources of 0 V, shorts. Currents that
//!   go round such a loop are left out; what is left never runs back to where it came from along such arcs. A loop
//!   in which a drop and a source cancel is one "of conducting diodes and voltage sources whose voltages sum to
//!   zero": its current is open, without end.
//! - Shorts (inductors, 0 Ω) are otherwise treated like 0 V sources; the generators make no loop of shorts alone.

// each test binary takes its own share of this
#![allow(dead_code, unused_imports)]

mod affine;
mod answer;
mod cone;
mod enumerate;
mod laws;
mod parts;

mod rational;

pub use answer::{Answer, Range, StateWord, Verdict};
pub use enumerate::{Assumed, solve, with_states};
pub use parts::{Division, Part, acceptable_verdicts, divide};
pub use rational::Rat;

/// The exact value of a decimal.
pub fn exact(value: crate::circuits::decimal::Dec) -> Rat {
    &Rat::whole(value.digits.into()) * &Rat::power_of_ten(value.exponent)
}

/// The nearest double, near enough for comparisons to 1e-15.
pub fn float(value: &Rat) -> f64 {
    value.float()
}
