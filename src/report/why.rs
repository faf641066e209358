//! The reasoning about one diode, for a person: what it would see if it blocked, why the state follows, and
//! which source would change it. The sentences come from `operating`; only their layout is made here.

use super::paint::{Ink, Page, clean, wrap};
use super::states::{all_conditions, state_ink};
use crate::analysis::Analysis;
use crate::operating::{Reasoning, State};

/// Running text is broken at this width.
const WIDTH: usize = 96;

/// Writes the reasoning about the diode that was asked for, if there is any.
pub fn why(page: &mut Page, analysis: &Analysis) {
    let Some(why) = analysis.operating.as_ref().and_then(|o| o.why.as_ref()) else { return };
    let circuit = &analysis.circuit;
    let name = clean(&circuit.element_name(why.element));
    let span = circuit.element(why.element).statement;
    let (start, _) = analysis.sources.positions(span);
    let line = analysis.sources.slice(span).lines().next().unwrap_or("");
    page.ink(Ink::Strong, &format!("why {name}")).plain("   ");
    let place = format!("{}:{}  {}", analysis.sources.name(span.file), start.line, line);
    page.ink(Ink::Faint, &clean(&place)).end();
    let all = analysis.operating.as_ref().map_or(0, |o| o.cases.len());
    for reasoning in &why.reasonings {
        write_reasoning(page, &name, reasoning, all);
    }
    page.end();
}

fn write_reasoning(page: &mut Page, name: &str, reasoning: &Reasoning, all: usize) {
    let state = reasoning.state.word();
    page.plain("  ").plain(name).plain(if reasoning.state == State::Breakdown { " is in " } else { " is " });
    match state_ink(reasoning.state) {
        Some(ink) => page.ink(ink, state),
        None => page.plain(state),
    };
    if reasoning.cases.len() == all && all > 1 {
        page.plain(" in ").ink(Ink::Faint, &all_conditions(all)).end();
    } else {
        page.plain(": ");
        // the first line is shorter by what stands before it
        let cases = clean(&reasoning.cases.join(", "));
        for (n, line) in wrap(&cases, page.room(WIDTH) - 20).iter().enumerate() {
            page.plain(if n == 0 { "" } else { "    " }).ink(Ink::Faint, line).end();
        }
    }
    for (n, sentence) in reasoning.sentences.iter().enumerate() {
        item(page, &format!("{:>4}. ", n + 1), sentence);
    }
    item(page, "      ", &reasoning.flip_sentence);
}

/// A sentence behind its number, further lines under its first word.
fn item(page: &mut Page, lead: &str, sentence: &str) {
    if sentence.is_empty() {
        return;
    }
    let room = lead.chars().count();
    for (n, line) in wrap(sentence, page.room(WIDTH) - room).iter().enumerate() {
        match n {
            0 => page.ink(Ink::Faint, lead),
            _ => page.plain(&" ".repeat(room)),
        };
        page.plain(line).end();
    }
}
