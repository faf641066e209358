//! What all rules share: what a rule is, what it may look at, and running them. No judgement of circuits here.

mod accept;
mod cases;
mod condition;
mod consequences;
mod evidence;
mod expect;
mod instances;
mod loose;
mod met;
mod ratings;
mod rule;
mod run;
mod standing;
mod trusted;
mod turn;
mod words;

pub use accept::about_note;
pub use cases::{Shown, causes, finding, in_cases, is_hopeless, is_told};
pub use evidence::Evidence;
pub use expect::{About, Claim, Found, Outcome, Rivals, claims, expected};
pub use loose::{LooseEnd, is_needed_port};
pub use ratings::Limit;
pub use rule::{Check, Group, Rule, Skipped};
pub use run::{run, settle};
pub use standing::{Regions, Seen, behind};
pub use trusted::{In, by_diode, folded, in_case};
pub use turn::turn_round;
pub use words::{count, list};
