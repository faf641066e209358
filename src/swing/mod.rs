//! How far currents and voltages move, over the conditions and over time: the circuit as equations of time, its
//! states step by step, the periodic state, and what each diode and node shows in it. The mathematics of a step is
//! `complementarity`'s; judging is `rules`'s.

mod conditions;
mod equations;
mod follow;
mod inputs;
mod parts;
mod record;
mod result;
mod rhythm;
mod run;
mod start;
mod timing;

pub use follow::follow;
pub use result::{DiodeSwing, Effort, Level, NodeSwing, OverConditions, OverTime, Swing, Wave};
