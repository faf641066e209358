//! Marks that are out of date, for a person: what each says and what the circuit gives.

use super::paint::{Ink, Page, clean};
use super::summary::counted;
use crate::review::Annotated;

/// Writes what differs in one file; nothing where nothing does.
pub fn marks(page: &mut Page, name: &str, annotated: &Annotated) {
    for change in &annotated.changes {
        page.ink(Ink::Strong, &clean(&format!("{name}:{}  {}", change.line, change.name))).end();
        let line = |page: &mut Page, what: &str, text: &str| {
            page.ink(Ink::Faint, &format!("  {what:<9}")).plain(&clean(text)).end();
        };
        match &change.old {
            Some(old) => line(page, "mark", &format!(";@ {old}")),
            None => line(page, "mark", "none"),
        }
        match &change.new {
            Some(new) => line(page, "circuit", &format!(";@ {new}")),
            None => line(page, "circuit", "no diode here"),
        }
    }
    if !annotated.changes.is_empty() {
        let (verb, them) = if annotated.changes.len() == 1 { ("is", "it") } else { ("are", "them") };
        let text = format!(
            "{}: {} {verb} out of date; `kneewise annotate --write` puts {them} right",
            clean(name),
            counted(annotated.changes.len(), "mark"),
        );
        page.plain(&text).end();
    }
}
