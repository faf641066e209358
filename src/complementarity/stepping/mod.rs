//! Piecewise-linear systems in time: linear laws, storage, junctions and gates as numbered unknowns, and the steps
//! that follow them. Mathematics only: what the unknowns mean is `swing`'s.
//!
//! One linear complementarity problem a stage (Acary, Bonnefon & Brogliato, Nonsmooth Modeling and Simulation for
//! Switched Circuits, Springer 2011); the steps are the two-stage singly diagonally implicit Runge-Kutta method with
//! γ = 1 − 1/√2, which is L-stable and of order two (Alexander, SIAM J. Numer. Anal. 14 (1977) 1006-1021).

mod dense;
mod march;
mod orbit;
mod pace;
mod settle;
mod solver;
mod sparse;
mod system;
#[cfg(test)]
mod tests;

pub(crate) use march::{Drive, End, Limits, March, Observer, Segment, Step};
pub(crate) use orbit::find_orbit;
pub(crate) use solver::Solver;
pub(crate) use system::{Affine, BARE, Cell, Gate, Mode, StepJunction, System, TIE};
