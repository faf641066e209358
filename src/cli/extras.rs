//! What belongs to an installation: completions for shells and the manual page, from the definition of the arguments.

use super::End;
use super::args::Args;
use super::output::Console;
use clap::CommandFactory;
use kneewise::text::trouble;

pub fn completions(console: &mut Console, shell: clap_complete::Shell) -> End {
    let mut out = Vec::new();
    clap_complete::generate(shell, &mut Args::command(), "kneewise", &mut out);
    finish(console, &out)
}

/// One page for the program and its commands.
pub fn manual(console: &mut Console) -> End {
    let mut out = Vec::new();
    let command = Args::command();
    let visible: Vec<_> = command.get_subcommands().filter(|c| !c.is_hide_set()).cloned().collect();
    let mut pages = vec![command];
    pages.extend(visible.into_iter().map(|c| {
        let name = format!("kneewise-{}", c.get_name());
        c.display_name(name)
    }));
    for (n, page) in pages.into_iter().enumerate() {
        let page = clap_mangen::Man::new(page);
        let rendered = match n {
            0 => page.render(&mut out),
            // one document: what follows the first page's head are sections of it
            _ => page
                .render_name_section(&mut out)
                .and_then(|()| page.render_synopsis_section(&mut out))
                .and_then(|()| page.render_options_section(&mut out)),
        };
        if let Err(problem) = rendered {
            console.say(&format!("the manual page could not be written: {}", trouble::writing(&problem)));
            return End::Failed;
        }
    }
    finish(console, &out)
}

fn finish(console: &mut Console, out: &[u8]) -> End {
    if console.result(&String::from_utf8_lossy(out)) { End::Clean } else { End::Failed }
}
