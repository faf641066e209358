//! Rows with names at their left, and where they stand in the picture.

use super::style::{self, Area, INK};
use plotters::style::text_anchor::HPos;
use std::error::Error;

/// Room for names at the left, and at the right.
pub(super) const LEFT: i32 = 112;
pub(super) const RIGHT: i32 = 24;

/// Height of a row.
pub(super) const ROW: i32 = 24;

/// A name cut to the room that there is.
fn short(name: &str) -> String {
    const MOST: usize = 13;
    if name.chars().count() <= MOST {
        return name.to_owned();
    }
    let tail: String = name.chars().rev().take(MOST - 1).collect();
    format!("…{}", tail.chars().rev().collect::<String>())
}

/// Writes a name at the left of a row; the end of a path says more than its beginning.
pub(super) fn name(area: &Area<'_>, text: &str, y: i32) -> Result<(), Box<dyn Error + Send + Sync>> {
    let clean: String = text.chars().filter(|c| !c.is_control()).collect();
    style::write(area, &short(&clean), (LEFT - 10, y), &style::words(13, INK, HPos::Right))
}
