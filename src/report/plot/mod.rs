//! Swings as a picture: a timeline with one row a diode, the watched waveforms beneath it on the same axis, and the
//! currents of all diodes on a logarithmic axis with the span in which their drops hold. Drawn by plotters as SVG;
//! readable in light and dark, and without telling colours apart: states differ in height, and words name them.

mod currents;
mod rows;
mod style;
mod timeline;
mod waves;

use crate::analysis::Analysis;
use crate::text::FileId;
use plotters::prelude::*;
use std::error::Error;

/// Width of a picture, pixels.
const WIDTH: u32 = 960;

/// Rows of diodes that are drawn at most.
const MOST_ROWS: usize = 48;

type Drawn = Result<(), Box<dyn Error + Send + Sync>>;

/// The picture of one file as SVG.
///
/// # Errors
/// Where it cannot be drawn, in words; nothing is known that leads to it.
pub fn svg(analysis: &Analysis) -> Result<String, String> {
    let mut text = String::new();
    draw(analysis, &mut text).map_err(|problem| problem.to_string())?;
    Ok(style::with_colours(&text))
}

/// The same as one self-contained page.
///
/// # Errors
/// As for [`svg`].
pub fn html(analysis: &Analysis) -> Result<String, String> {
    let picture = svg(analysis)?;
    let title = style::escaped(analysis.sources.name(FileId(0)));
    Ok(format!(
        "<!doctype html>\n<html lang=\"en\">\n<meta charset=\"utf-8\">\n<meta name=\"color-scheme\" \
         content=\"light dark\">\n<title>{title}: what moves</title>\n<style>{}</style>\n<main>\n{picture}\n\
         </main>\n</html>\n",
        style::PAGE
    ))
}

fn draw(analysis: &Analysis, text: &mut String) -> Drawn {
    let timeline = timeline::Timeline::of(analysis);
    let waves = waves::waves(analysis);
    let currents = currents::Currents::of(analysis);
    let heights = [style::TITLE, timeline.height(), waves.len() as u32 * waves::HEIGHT, currents.height()];
    let height = heights.iter().sum::<u32>().max(80);
    let root = SVGBackend::with_string(text, (WIDTH, height)).into_drawing_area();
    root.fill(&style::PAPER)?;
    style::title(&root, &heading(analysis))?;
    let mut top = style::TITLE;
    if timeline.height() > 0 {
        timeline.draw(&root, top)?;
    }
    top += timeline.height();
    for wave in &waves {
        wave.draw(&root, top)?;
        top += waves::HEIGHT;
    }
    if currents.height() > 0 {
        currents.draw(&root, top)?;
    } else if top == style::TITLE {
        style::note(&root, top as i32 + 14, nothing(analysis))?;
    }
    root.present()?;
    Ok(())
}

/// Why there is nothing to draw.
fn nothing(analysis: &Analysis) -> &'static str {
    match analysis.circuit.elements.len() {
        0 => "There are no elements in this file, so there is nothing to draw.",
        _ => "No source moves and no diode carries a forward current, so there is nothing to draw.",
    }
}

fn heading(analysis: &Analysis) -> String {
    let file = analysis.sources.name(FileId(0));
    let when = analysis.swing.as_ref().and_then(|swing| {
        let span = crate::finding::quantity(swing.window, "s");
        swing.span?;
        Some(match (swing.period, swing.periodic) {
            (Some(_), true) => format!("one period of {span}, periodic state"),
            (Some(_), false) => format!("the last period of {span}, still drifting"),
            (None, _) => format!("a span of {span}"),
        })
    });
    match when {
        Some(when) => format!("{file}: {when}"),
        None => format!("{file}: over the conditions"),
    }
}
