//! Places in files as JSON holds them: lines and columns from 1, columns in code points, ends exclusive.

use crate::text::{Sources, Span};
use serde::Serialize;

/// A place.
#[derive(Serialize)]
pub(super) struct Place<'a> {
    file: &'a str,
    line: usize,
    column: usize,
    end_line: usize,
    end_column: usize,
}

impl<'a> Place<'a> {
    pub fn of(sources: &'a Sources, span: Span) -> Self {
        let (start, end) = sources.positions(span);
        Place {
            file: sources.name(span.file),
            line: start.line,
            column: start.column,
            end_line: end.line,
            end_column: end.column,
        }
    }
}
