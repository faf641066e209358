//! The screens and tables in the README are what the program really shows.

use crate::runner::{root, run};

fn readme() -> String {
    std::fs::read_to_string(root().join("README.md")).unwrap()
}

/// Every fenced block that opens with `$ kneewise …`, as its arguments and what stands under it.
fn screens(text: &str) -> Vec<(String, String)> {
    let mut screens = Vec::new();
    for block in text.split("```").skip(1).step_by(2) {
        let Some(rest) = block.split_once('\n').map(|(_, rest)| rest) else { continue };
        let Some((line, shown)) = rest.split_once('\n') else { continue };
        if let Some(arguments) = line.strip_prefix("$ kneewise ") {
            screens.push((arguments.to_owned(), shown.to_owned()));
        }
    }
    screens
}

#[test]
fn screens_in_the_readme_are_real() {
    let screens = screens(&readme());
    let commands: Vec<&str> = screens.iter().map(|(a, _)| a.split(' ').next().unwrap()).collect();
    assert!(commands.contains(&"check") && commands.contains(&"states"), "{commands:?}");
    for (arguments, shown) in screens {
        let words: Vec<&str> = arguments.split(' ').collect();
        let run = run(&words);
        assert_eq!(shown.trim_end(), run.out.trim_end(), "kneewise {arguments}");
    }
}

#[test]
fn the_rule_table_lists_every_rule() {
    let readme = readme();
    let table = readme.split("<!-- rules -->").nth(1).unwrap_or_default();
    assert_eq!(table.trim(), rule_table().trim(), "put this between the two marks:\n{}", rule_table());
}

/// The table as it must stand in the README.
fn rule_table() -> String {
    let mut table = String::from("| rule | severity | what it reports |\n|---|---|---|\n");
    for rule in kneewise::rules::all() {
        table.push_str(&format!("| `{}` | {} | {} |\n", rule.name, rule.severity.word(), rule.summary));
    }
    table
}
