//! Results as text: for a person, as JSON for a pipeline, as SARIF and Markdown for a review. Nothing is computed or
//! judged here, and nothing is printed: every report is handed back as a string.

mod comparison;
mod excerpt;
pub mod json;
pub mod markdown;
mod marks;
mod paint;
mod pen;
pub mod plot;
mod rules;
pub mod sarif;
mod states;
mod summary;
mod swing;
mod table;
mod terminal;
mod why;

pub use comparison::{Compared, Fate, comparison, markdown as comparison_markdown};
pub use marks::marks;
pub use paint::Page;
pub use rules::{rule, rule_list};
pub use states::states;
pub use summary::Summary;
pub use swing::swing;
pub use terminal::{accepted, findings, skipped};
pub use why::why;
