//! The DC operating point for each condition: circuit to network, drops, states, the view from each diode, and
//! the proof by substitution. Solving is `complementarity`'s; judging is `rules`'s.

mod result;

pub use result::{
    BranchResult, Case, Contradiction, DiodeResult, Drop, DropOrigin, Flip, NodeResult, Operating, Reasoning,
    Residual, Solution, Why,
};

pub use crate::circuit::State;
pub use crate::complementarity::{Interval, Quantity, Verdict, View};
