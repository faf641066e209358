//! Results as text: findings and states for a person, and both as JSON for a pipeline. Nothing is computed or
//! judged here, and nothing is printed: every report is handed back as a string.

mod excerpt;
pub mod json;
mod paint;
mod pen;
pub mod plot;
mod rules;
mod states;
mod summary;
mod swing;
mod table;
mod terminal;
mod why;

pub use paint::Page;
pub use rules::{rule, rule_list};
pub use states::states;
pub use summary::Summary;
pub use swing::swing;
pub use terminal::{findings, skipped};
pub use why::why;
