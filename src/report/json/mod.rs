//! Results for a pipeline. The keys, their order and the nulls are a promise to other programs; the schemas in
//! `grammar/` hold them, and a change of meaning raises `version`.

mod comparison;
mod findings;
mod place;
mod states;
mod swing;

pub use comparison::comparison;
pub use findings::findings;
pub use states::states;
pub use swing::swing;

/// A finite number, never with a minus before zero; infinite and undefined numbers are `null`.
fn number(value: f64) -> Option<f64> {
    value.is_finite().then_some(value + 0.0)
}

/// One line of JSON.
///
/// # Errors
/// None is known: all keys are strings and all numbers finite.
fn line(value: &impl serde::Serialize) -> serde_json::Result<String> {
    let mut text = serde_json::to_string(value)?;
    text.push('\n');
    Ok(text)
}
