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
    for command in ["$ kneewise check ", "$ kneewise states ", "$ kneewise annotate ", "$ kneewise compare "]
    {
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
        writeln!(table, "| `{}` | {} | {} |", rule.name, rule.severity_words(), rule.summary).unwrap();
    }
    format!("{before}{RULES}{table}{RULES}{after}")
}

/// The lines of the pipeline that the README proposes do what it says, in a repository with a faulty change.
#[test]
fn the_pipeline_of_the_readme_runs() {
    let text = std::fs::read_to_string(root().join("README.md")).unwrap();
    let after = text.split("<!-- pipeline -->").nth(1).unwrap();
    let script = after.split(FENCE).nth(1).unwrap();
    let folder = crate::runner::scratch("readme-pipeline");
    let sh = |script: &str| {
        let program = std::path::Path::new(env!("CARGO_BIN_EXE_kneewise")).parent().unwrap();
        let path = format!("{}:{}", program.display(), std::env::var("PATH").unwrap_or_default());
        let identity = "export GIT_AUTHOR_NAME=t GIT_AUTHOR_EMAIL=t@example.org GIT_COMMITTER_NAME=t \
                        GIT_COMMITTER_EMAIL=t@example.org\n";
        let mut command = std::process::Command::new("sh");
        command.args(["-c", &format!("{identity}{script}")]).env("PATH", path);
        command.current_dir(&folder).stdin(std::process::Stdio::null()).output().unwrap()
    };
    if !sh("command -v git").status.success() {
        return;
    }
    let made = sh(
        "git init -q -b main upstream && cd upstream && printf 'lamp\\nV1 a 0 5\\nR1 a b 1M\\nD1 b 0 DX\\n.model DX D\\n' \
                   > lamp.net && git add . && git commit -qm first && cd .. && git clone -q upstream work",
    );
    assert!(made.status.success(), "{}", String::from_utf8_lossy(&made.stderr));
    let clean = sh(&format!("cd work\n{script}"));
    assert_eq!(clean.status.code(), Some(0), "{}", String::from_utf8_lossy(&clean.stderr));
    let change = "sed 's/D1 b 0/D1 0 b/' lamp.net > changed && printf 'R2 a 0 2M\\n' >> changed && mv changed lamp.net";
    let faulty = sh(&format!("cd work\n{change}\n{script}"));
    assert_eq!(faulty.status.code(), Some(1), "{}", String::from_utf8_lossy(&faulty.stderr));
    let comment = std::fs::read_to_string(folder.join("work/kneewise.md")).unwrap();
    assert!(comment.contains("States that flip") && comment.contains("R2"), "{comment}");
    let log = std::fs::read_to_string(folder.join("work/kneewise.sarif")).unwrap();
    assert!(log.contains("\"baselineState\":\"new\""), "{log}");
}
