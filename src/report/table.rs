//! Columns that line up: words to the left, figures with their numbers to the right and their units under
//! each other.

use super::paint::{Ink, Page, columns};
use crate::finding::Figure;

/// Room between two columns.
const GAP: &str = "   ";

/// One cell.
#[derive(Debug, Clone, Default)]
pub(super) struct Cell {
    /// A word, or the number of a figure.
    pub text: String,
    /// The unit of a figure; empty for words.
    pub unit: String,
    /// Its ink.
    pub ink: Option<Ink>,
}

impl Cell {
    pub fn word(text: impl Into<String>) -> Self {
        Cell { text: text.into(), ..Cell::default() }
    }

    pub fn inked(text: impl Into<String>, ink: Option<Ink>) -> Self {
        Cell { text: text.into(), unit: String::new(), ink }
    }
}

impl From<Figure> for Cell {
    fn from(Figure { number, unit }: Figure) -> Self {
        Cell { text: number, unit, ink: None }
    }
}

/// Writes a table; the first row is the head.
pub(super) fn write(page: &mut Page, indent: &str, head: &[&str], rows: &[Vec<Cell>]) {
    let width = |of: fn(&Cell) -> &str, n: usize| {
        rows.iter().filter_map(|r| r.get(n)).map(|c| columns(of(c))).max().unwrap_or(0)
    };
    let units: Vec<usize> = (0..head.len()).map(|n| width(|c| &c.unit, n)).collect();
    let texts: Vec<usize> = (0..head.len())
        .map(|n| {
            let room = if units[n] > 0 { units[n] + 1 } else { 0 };
            let words = rows.iter().filter_map(|r| r.get(n)).map(|c| {
                // a word in a column of figures may stretch over the unit's room
                let own = columns(&c.text);
                if c.unit.is_empty() { own.saturating_sub(room) } else { own }
            });
            words.max().unwrap_or(0).max(columns(head[n]).saturating_sub(room))
        })
        .collect();
    let mut line = Line { page, pending: 0 };
    line.pad(columns(indent));
    for (n, title) in head.iter().enumerate() {
        let cell = Cell::inked(*title, Some(Ink::Faint));
        line.cell(&cell, texts[n], units[n], n + 1 == head.len());
    }
    line.end();
    for row in rows {
        line.pad(columns(indent));
        for (n, cell) in row.iter().enumerate() {
            line.cell(cell, texts[n], units[n], n + 1 == row.len());
        }
        line.end();
    }
}

/// A line under way; blanks are held back so that none trail.
struct Line<'a> {
    page: &'a mut Page,
    pending: usize,
}

impl Line<'_> {
    fn pad(&mut self, by: usize) {
        self.pending += by;
    }

    fn put(&mut self, ink: Option<Ink>, text: &str) {
        if text.is_empty() {
            return;
        }
        self.page.plain(&" ".repeat(std::mem::take(&mut self.pending)));
        match ink {
            Some(ink) => self.page.ink(ink, text),
            None => self.page.plain(text),
        };
    }

    fn cell(&mut self, cell: &Cell, text: usize, unit: usize, last: bool) {
        let room = text + if unit > 0 { unit + 1 } else { 0 };
        if cell.unit.is_empty() && unit == 0 {
            self.put(cell.ink, &cell.text);
            self.pad(room.saturating_sub(columns(&cell.text)));
        } else if cell.unit.is_empty() {
            self.pad(room.saturating_sub(columns(&cell.text)));
            self.put(cell.ink, &cell.text);
        } else {
            self.pad(text.saturating_sub(columns(&cell.text)));
            self.put(cell.ink, &format!("{} {}", cell.text, cell.unit));
            self.pad(unit - columns(&cell.unit).min(unit));
        }
        if !last {
            self.pad(GAP.len());
        }
    }

    fn end(&mut self) {
        self.pending = 0;
        self.page.end();
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::finding::figure;

    #[test]
    fn figures_line_up_at_their_units() {
        let mut page = Page::new(false);
        let rows = vec![
            vec![Cell::word("D1"), figure(4.31e-3, "A").into(), Cell::word("note")],
            vec![Cell::word("X1:D22"), figure(0.0, "A").into(), Cell::word("default")],
            vec![Cell::word("D3"), Cell::word("-"), Cell::word("")],
        ];
        write(&mut page, "  ", &["diode", "current", "drop from"], &rows);
        let expected = "  diode    current   drop from\n  D1       4.31 mA   note\n  \
                        X1:D22      0 A    default\n  D3             -\n";
        assert_eq!(page.text(), expected);
    }
}
