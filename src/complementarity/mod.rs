//! Piecewise-linear networks as mathematics: a graph whose branches obey linear laws or junction laws, and all
//! its solutions. No circuits, names, units or spans here; `operating` translates.

mod network;
mod outcome;

pub use network::{Branch, Control, Junction, Law, Level, Network};
pub use outcome::{Interval, Outcome, Part, Place, Quantity, Reason, Solution, Verdict, View};
