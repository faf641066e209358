//! `kneewise rules`: the rules, one line each, or one in full.

use super::End;
use super::args::Rules;
use super::output::Console;
use kneewise::report;
use kneewise::rules;
use kneewise::text::nearest;

pub fn run(console: &mut Console, command: &Rules) -> End {
    let mut page = console.page();
    match &command.name {
        None => report::rule_list(&mut page, rules::all()),
        Some(name) => match rules::find(name) {
            Some(rule) => report::rule(&mut page, rule),
            None => {
                let near = nearest(name, rules::all().iter().map(|rule| rule.name));
                let hint = near.map_or(String::new(), |near| format!("; did you mean `{near}`?"));
                console.say(&format!("there is no rule `{name}`{hint} (`kneewise rules` lists all)"));
                return End::Failed;
            }
        },
    }
    if console.result(page.text()) { End::Clean } else { End::Failed }
}
