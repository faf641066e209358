//! The look of pictures: colours for light and dark, type, the title.

use plotters::coord::Shift;
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};
use std::error::Error;

/// Height of the title.
pub(super) const TITLE: u32 = 34;

pub(super) const PAPER: RGBColor = RGBColor(255, 255, 255);
pub(super) const INK: RGBColor = RGBColor(31, 35, 40);
pub(super) const FAINT: RGBColor = RGBColor(101, 109, 118);
pub(super) const LINE: RGBColor = RGBColor(208, 215, 222);
pub(super) const CONDUCTING: RGBColor = RGBColor(26, 127, 55);
pub(super) const BLOCKING: RGBColor = RGBColor(140, 149, 159);
pub(super) const BREAKDOWN: RGBColor = RGBColor(191, 57, 137);
pub(super) const WAVE: RGBColor = RGBColor(9, 105, 218);
pub(super) const SPAN: RGBColor = RGBColor(255, 241, 214);
pub(super) const CASES: RGBColor = RGBColor(188, 76, 0);

/// Each colour, and what it becomes where the reader's screen is dark.
const DARK: [(RGBColor, &str); 10] = [
    (PAPER, "#0d1117"),
    (INK, "#e6edf3"),
    (FAINT, "#9198a1"),
    (LINE, "#30363d"),
    (CONDUCTING, "#3fb950"),
    (BLOCKING, "#6e7681"),
    (BREAKDOWN, "#f778ba"),
    (WAVE, "#58a6ff"),
    (SPAN, "#3a2d12"),
    (CASES, "#ffa657"),
];

/// Of the page around a picture.
pub(super) const PAGE: &str = "body{margin:0;background:#fff}main{max-width:1100px;margin:0 auto}svg{width:100%;height:auto}\
    @media(prefers-color-scheme:dark){body{background:#0d1117}}";

pub(super) type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;

/// Text in ink, smaller where it only labels.
pub(super) fn words(size: i32, colour: RGBColor, anchor: HPos) -> TextStyle<'static> {
    TextStyle {
        color: colour.to_backend_color(),
        pos: Pos::new(anchor, VPos::Center),
        ..TextStyle::from(("sans-serif", size).into_font())
    }
}

/// Writes at a pixel of the picture.
pub(super) fn write(
    area: &Area<'_>,
    text: &str,
    at: (i32, i32),
    style: &TextStyle<'_>,
) -> Result<(), Box<dyn Error + Send + Sync>> {
    area.draw(&Text::new(text.to_owned(), at, style.clone()))?;
    Ok(())
}

/// The title.
pub(super) fn title(area: &Area<'_>, text: &str) -> Result<(), Box<dyn Error + Send + Sync>> {
    write(area, text, (16, TITLE as i32 / 2), &words(15, INK, HPos::Left))
}

/// A sentence under the title.
pub(super) fn note(area: &Area<'_>, y: i32, text: &str) -> Result<(), Box<dyn Error + Send + Sync>> {
    write(area, text, (16, y), &words(12, FAINT, HPos::Left))
}

/// A colour as the picture writes it.
fn hex(colour: RGBColor) -> String {
    format!("#{:02X}{:02X}{:02X}", colour.0, colour.1, colour.2)
}

/// Adds the colours of dark screens: rules of style win over the colours of the elements.
pub(super) fn with_colours(svg: &str) -> String {
    let rules: String = DARK
        .iter()
        .map(|(light, dark)| {
            let light = hex(*light);
            format!("[fill=\"{light}\"]{{fill:{dark}}}[stroke=\"{light}\"]{{stroke:{dark}}}")
        })
        .collect();
    let style = format!(
        "<style>text{{font-family:system-ui,sans-serif}}@media(prefers-color-scheme:dark){{{rules}}}</style>"
    );
    match svg.find('>') {
        Some(at) => format!("{}{style}{}", &svg[..=at], &svg[at + 1..]),
        None => svg.to_owned(),
    }
}

/// Text inside of a page.
pub(super) fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;")
}

/// One word of a legend and how its swatch is drawn.
pub(super) struct Word {
    pub colour: RGBColor,
    /// Height of the swatch in pixels.
    pub height: i32,
    pub text: &'static str,
}

/// Writes a legend from the left.
pub(super) fn legend(area: &Area<'_>, y: i32, list: &[Word]) -> Result<(), Box<dyn Error + Send + Sync>> {
    let mut x = 112;
    for word in list {
        let half = word.height / 2;
        let corners = [(x, y - half), (x + 22, y - half + word.height.max(2))];
        area.draw(&Rectangle::new(corners, word.colour.filled()))?;
        write(area, word.text, (x + 30, y), &words(12, INK, HPos::Left))?;
        x += 52 + 7 * word.text.chars().count() as i32;
    }
    Ok(())
}
