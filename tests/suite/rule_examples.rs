//! Every rule's failing example gives exactly one finding of that rule and no other warning or error; its
//! passing example gives nothing at all.

use kneewise::analysis::{Analysis, analyse};
use kneewise::config::{Options, settings};
use kneewise::finding::{Finding, Severity};
use kneewise::rules::{self, Group, Rule};
use kneewise::text::{FileId, Memory};
use std::path::Path;

fn check(rule: &Rule, which: &str, text: &str) -> Analysis {
    let name = format!("{}-{which}.cir", rule.name);
    let mut files = Memory::with(name.as_str(), text);
    let options = Options { states: true, swing: true, ..Options::default() };
    analyse(&mut files, Path::new(&name), &options).unwrap()
}

fn tell(analysis: &Analysis) -> String {
    let line = |f: &Finding| {
        let at = analysis.sources.positions(f.span).0;
        format!("  {} {} at {}:{}: {}", f.severity.word(), f.rule, at.line, at.column, f.message)
    };
    analysis.findings.iter().map(line).collect::<Vec<_>>().join("\n")
}

/// What is wrong with the way a finding is told: the message has no final full stop, the help is whole sentences.
fn style(finding: &Finding) -> Option<String> {
    let Finding { message, help, .. } = finding;
    if message.is_empty() || message.ends_with('.') {
        return Some(format!("the message is one sentence without its full stop: {message}"));
    }
    let begins = help.chars().next().is_some_and(|c| !c.is_lowercase());
    (!begins || !help.ends_with('.')).then(|| format!("the help is whole sentences: {help}"))
}

/// What is wrong with the examples of a rule about settings, which are settings.
fn settings_complaints(rule: &Rule) -> Vec<String> {
    let names: Vec<&str> = rules::all().iter().map(|r| r.name).collect();
    let told = |text: &str| settings(text, FileId(0), &names).1;
    let (failing, passing) = (told(rule.failing), told(rule.passing));
    let mut wrong: Vec<String> = failing.iter().filter_map(style).collect();
    if failing.iter().any(|f| f.rule != rule.name) || failing.is_empty() || !passing.is_empty() {
        wrong.push(format!("{}: {failing:?} {passing:?}", rule.name));
    }
    wrong
}

/// What is wrong with a rule's examples.
fn complaints(rule: &Rule) -> Vec<String> {
    if rule.group == Group::Settings {
        return settings_complaints(rule);
    }
    let mut wrong = Vec::new();
    let failing = check(rule, "failing", rule.failing);
    if failing.skipped.iter().any(|s| s.rule == rule.name) {
        wrong.push(format!("{} could not judge its own example", rule.name));
    }
    let own = failing.findings.iter().filter(|f| f.rule == rule.name).count();
    let others =
        failing.findings.iter().filter(|f| f.rule != rule.name && f.severity > Severity::Note).count();
    if own != 1 || others != 0 {
        wrong.push(format!("{}, failing example: {own} of its own\n{}", rule.name, tell(&failing)));
    }
    let passing = check(rule, "passing", rule.passing);
    if !passing.findings.is_empty() {
        wrong.push(format!("{}, passing example:\n{}", rule.name, tell(&passing)));
    }
    for finding in failing.findings.iter().chain(&passing.findings) {
        match rules::find(finding.rule) {
            None => wrong.push(format!("no rule file for {}", finding.rule)),
            Some(found) if ![Some(found.severity), found.also].contains(&Some(finding.severity)) => {
                wrong.push(format!("{} does not declare {}", found.name, finding.severity.word()));
            }
            Some(_) => {}
        }
        wrong.extend(style(finding).map(|what| format!("{}: {what}\n{}", rule.name, tell(&failing))));
    }
    wrong
}

#[test]
fn examples_of_every_rule_give_what_they_promise() {
    let wrong: Vec<String> = rules::all().iter().flat_map(|rule| complaints(rule)).collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
