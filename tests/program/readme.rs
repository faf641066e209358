//! The screens and the table of rules in the README are what the program really shows. After a change,
//! `UPDATE_README=1 cargo test --test program readme` writes them anew; read what it wrote before you commit.

use crate::runner::{root, run};
use std::fmt::Write as _;

const FENCE: &str = "```";
const RULES: &str = "<!-- rules -->";

#[test]
fn the_readme_shows_what_the_program_does() {
    let path = root().join("README.md");
    let written = std::fs::read_to_string(&path).unwrap();
    let real = with_rules(&with_screens(&written));
    if std::env::var_os("UPDATE_README").is_some() {
        std::fs::write(&path, &real).unwrap();
        return;
    }
    for (line, (written, real)) in written.lines().zip(real.lines()).enumerate() {
        assert_eq!(written, real, "README.md:{}; UPDATE_README=1 writes it anew", line + 1);
    }
    assert_eq!(written.len(), real.len());
    for command in ["$ kneewise check ", "$ kneewise states "] {
        assert!(written.contains(command), "the README shows no `{command}`");
    }
}

/// Every fenced block whose first line is `$ kneewise …` with what that command shows.
fn with_screens(text: &str) -> String {
    let mut out = String::new();
    for (n, part) in text.split(FENCE).enumerate() {
        if n > 0 {
            out.push_str(FENCE);
        }
        let first = part.strip_prefix('\n').and_then(|p| p.lines().next());
        match first.and_then(|line| line.strip_prefix("$ kneewise ")).filter(|_| n % 2 == 1) {
            Some(arguments) => {
                let words: Vec<&str> = arguments.split(' ').collect();
                write!(out, "\n$ kneewise {arguments}\n{}\n", run(&words).out.trim_end()).unwrap();
            }
            None => out.push_str(part),
        }
    }
    out
}

/// The table between the two marks, from the rules themselves.
fn with_rules(text: &str) -> String {
    let parts: Vec<&str> = text.split(RULES).collect();
    let [before, _, after] = parts[..] else { panic!("the README has no two `{RULES}` marks") };
    let mut table = String::from("\n| rule | severity | what it reports |\n|---|---|---|\n");
    for rule in kneewise::rules::all() {
        writeln!(table, "| `{}` | {} | {} |", rule.name, rule.severity.word(), rule.summary).unwrap();
    }
    format!("{before}{RULES}{table}{RULES}{after}")
}
