//! `kneewise rules`: the rules, one line each, or one in full.

use super::End;
use super::args::Rules;
use super::output::Console;
use kneewise::report;
use kneewise::rules;
use kneewise::text::nearest;

/// Rules whose names hold what was asked for, listed as hints at most.
const MOST_HINTS: usize = 6;

pub fn run(console: &mut Console, command: &Rules) -> End {
    let mut page = console.page();
    match &command.name {
        None => report::rule_list(&mut page, rules::all()),
        Some(name) => match rules::find(name) {
            Some(rule) => report::rule(&mut page, rule),
            None => {
                let names = || rules::all().iter().map(|rule| rule.name);
                let near = nearest(name, names());
                let holding: Vec<&str> = names().filter(|n| n.contains(&name.to_lowercase())).collect();
                let hint = match (near, holding.as_slice()) {
                    (Some(near), _) => format!("; did you mean `{near}`?"),
                    (None, [_, ..]) if holding.len() <= MOST_HINTS => {
                        format!("; did you mean one of {}?", holding.join(", "))
                    }
                    (None, _) => String::new(),
                };
                console.say(&format!("there is no rule `{name}`{hint} (`kneewise rules` lists all)"));
                return End::Failed;
            }
        },
    }
    if console.result(page.text()) { End::Clean } else { End::Failed }
}
