//! What all rules share: what a rule is, what it may look at, and running them. No judgement of circuits here.

mod evidence;
mod instances;
mod rule;
mod run;

pub use evidence::Evidence;
pub use rule::{Check, Rule, Skipped};
pub use run::run;
