//! Piecewise-linear networks as mathematics: a graph whose branches obey linear laws or junction laws, and all
//! its solutions. No circuits, names, units or spans here; `operating` translates.

mod assemble;
mod bundle;
mod combinations;
mod continuum;
mod curve;
mod decimal;
mod double_double;
mod equations;
mod exact;
mod excite;
mod existence;
mod flow;
mod forest;
mod full;
mod general;
mod idle;
mod interior;
mod laplacian;
mod linear;
mod lower;
mod mesh;
mod network;
mod openness;
mod ordering;
mod outcome;
mod parts;
mod passive;
mod pivoting;
mod ports;
mod potentials;
mod rails;
mod settle;
mod smooth;
mod smooth_general;
mod smooth_passive;
#[cfg(test)]
mod smooth_tests;
mod solve;
pub(crate) mod stepping;
mod supernodal;
#[cfg(test)]
mod tests;
mod tie_currents;
mod views;

pub use curve::{Curve, Tail};
pub(crate) use decimal::sign_of_sum;
pub use excite::Spread;
pub use network::{Branch, Control, Junction, Law, Level, Network};
pub use outcome::{Interval, Outcome, Part, Place, Quantity, Reason, Solution, Verdict, View};
pub use smooth::{Smooth, Smoothness};
pub use views::{Looks, Questions};
