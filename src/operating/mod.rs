//! The DC operating point for each condition: circuit to network, drops, states, the view from each diode, and
//! the proof by substitution. Solving is `complementarity`'s; judging is `rules`'s.

mod assemble;
mod basis;
mod case;
mod condition;
mod declared;
mod drop;
mod evaluate;
mod excerpt;
mod flip;
mod knee;
mod law;
mod material;
mod named;
mod opinion;
mod proof;
mod reach;
mod result;
mod search;
mod speaker;
mod switch;
mod targets;
#[cfg(test)]
mod tests;
mod trust;
mod view;
mod why;
mod words;

pub(crate) use assemble::main_path;
pub(crate) use basis::{Basis, Standing};
pub use evaluate::{Text, evaluate};
pub use law::{JunctionLaw, nearest_decade, thermal_voltage};
pub use material::{MATERIALS, Material};
pub use result::{
    BranchResult, Case, Cause, DifferenceOf, DifferenceResult, DiodeResult, Drop, DropOrigin, ErrorBar, Flip,
    Knee, NodeResult, Operating, Reasoning, Refined, Residual, Solution, Trust, Unrefined, Why,
};
pub use speaker::against;
pub(crate) use speaker::apart;

pub use crate::circuit::State;
pub use crate::complementarity::{Interval, Quantity, Verdict, View};
