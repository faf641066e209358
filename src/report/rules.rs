//! The rules for a person: the list, and one rule in full with its two examples.

use super::paint::{Ink, Page, wrap};
use super::table::{self, Cell};
use super::terminal::ink;
use crate::rules::{Group, Rule};

/// Running text is broken at this width.
const WIDTH: usize = 96;

/// Writes one line for each rule, group by group.
pub fn rule_list(page: &mut Page, rules: &[&Rule]) {
    for group in Group::ALL {
        let rows: Vec<Vec<Cell>> = rules
            .iter()
            .filter(|rule| rule.group == group)
            .map(|rule| {
                vec![
                    Cell::word(rule.name),
                    Cell::inked(rule.severity_words(), Some(ink(rule.worst()))),
                    Cell::word(rule.summary),
                ]
            })
            .collect();
        if !rows.is_empty() {
            table::write(page, "  ", &[group.word(), "", ""], &rows);
            page.end();
        }
    }
    page.plain("`kneewise rules NAME` tells one in full, with a netlist that fails it and one that passes.")
        .end();
}

/// Writes one rule in full.
pub fn rule(page: &mut Page, rule: &Rule) {
    page.ink(Ink::Strong, rule.name).plain("   ");
    page.ink(ink(rule.worst()), &rule.severity_words()).plain(", ").plain(rule.group.word()).end();
    paragraph(page, rule.summary);
    paragraph(page, rule.why);
    paragraph(page, rule.remedy);
    if let Some(source) = rule.source {
        paragraph(page, &format!("Source: {source}"));
    }
    example(page, "This is reported:", rule.failing);
    example(page, "This is not:", rule.passing);
}

fn paragraph(page: &mut Page, text: &str) {
    page.end();
    for line in wrap(text, page.room(WIDTH)) {
        page.plain("  ").plain(&line).end();
    }
}

fn example(page: &mut Page, title: &str, netlist: &str) {
    page.end();
    page.plain("  ").plain(title).end();
    for line in netlist.trim_matches('\n').lines() {
        page.plain("      ").ink(Ink::Faint, line).end();
    }
}
