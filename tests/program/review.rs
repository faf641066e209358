//! A change goes through review: a sound board, a faulty change, marks that are out of date, the comparison, the mended
//! board; every screen is kept in `screens/`. After a change of words: `INSTA_UPDATE=always cargo test --test program
//! review`, then read what it wrote.

use crate::runner::{Run, command, root, run_in, scratch};
use std::path::{Path, PathBuf};
use std::process::Command;

const BOARD: &str = "\
Tide gauge buoy, sheet PWR-1: panel and battery share one bus
VPANEL  sun    0      18.4
RPANEL  sun    panel  2.2      ; slope of the panel's curve
D1      panel  bus    DSCHOT   ; charger path
VBATT   cell   0      12.6
RBATT   cell   batt   80m
D2      batt   bus    DSCHOT
RLOAD   bus    0      47
*@ range VPANEL 0 21
*@ expect D2 blocking at nominal
*@ expect v(bus) 11..20
.model DSCHOT D(IS=3.2u N=1.04 RS=42m BV=60)
.end
";

/// The change under review: one diode is turned round, and a node is misspelt.
fn faulty() -> String {
    BOARD.replace("D1      panel  bus ", "D1      bus    panel").replace("RLOAD   bus ", "RLOAD   bsu ")
}

/// Keeps what a run showed, under a name.
fn screen(name: &str, arguments: &[&str], run: &Run) {
    let mut text = format!("$ kneewise {}\n{}", arguments.join(" "), run.out);
    if !run.err.is_empty() {
        text.push_str(&format!("[standard error]\n{}", run.err));
    }
    text.push_str(&format!("[exit code {}]\n", run.code));
    let mut settings = insta::Settings::clone_current();
    settings.set_snapshot_path("screens");
    settings.set_prepend_module_to_snapshot(false);
    settings.set_omit_expression(true);
    settings.bind(|| insta::assert_snapshot!(name, text));
}

/// Runs in the folder and keeps the screen.
fn show(name: &str, folder: &Path, arguments: &[&str]) -> Run {
    let run = run_in(folder, arguments);
    screen(name, arguments, &run);
    run
}

fn folder(name: &str, files: &[(&str, &str)]) -> PathBuf {
    let folder = scratch(&format!("review-{name}"));
    for (file, text) in files {
        let path = folder.join(file);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, text).unwrap();
    }
    folder
}

#[test]
fn a_change_goes_through_review() {
    let folder = folder("story", &[("charger.net", BOARD), ("main.net", BOARD)]);
    let file = folder.join("charger.net");
    assert_eq!(show("story-01-clean", &folder, &["check", "charger.net"]).code, 0);
    show("story-02-marks", &folder, &["annotate", "charger.net"]);
    assert_eq!(show("story-03-written", &folder, &["annotate", "charger.net", "--write"]).code, 0);
    assert_eq!(run_in(&folder, &["annotate", "charger.net", "--verify"]).code, 0);
    let marked = std::fs::read_to_string(&file).unwrap();
    // a colleague turns a diode round, and the marks stand where they stood
    let changed =
        marked.replace("D1      panel  bus ", "D1      bus    panel").replace("RLOAD   bus ", "RLOAD   bsu ");
    std::fs::write(&file, &changed).unwrap();
    assert_eq!(show("story-04-faulty", &folder, &["check", "charger.net"]).code, 1);
    assert_eq!(show("story-05-out-of-date", &folder, &["annotate", "charger.net", "--verify"]).code, 1);
    assert_eq!(show("story-06-compared", &folder, &["compare", "main.net", "charger.net"]).code, 1);
    show("story-07-comment", &folder, &["compare", "main.net", "charger.net", "--format", "markdown"]);
    show("story-08-summary", &folder, &["check", "charger.net", "--format", "markdown"]);
    let news = show("story-09-news", &folder, &["check", "charger.net", "--against", "main.net"]);
    assert_eq!(news.code, 1);
    // mended: the marks are right again, and the comparison is empty
    std::fs::write(&file, &marked).unwrap();
    assert_eq!(run_in(&folder, &["annotate", "charger.net", "--verify"]).code, 0);
    assert_eq!(show("story-10-mended", &folder, &["compare", "main.net", "charger.net"]).code, 0);
    assert_eq!(run_in(&folder, &["annotate", "charger.net", "--strip"]).out, BOARD);
}

#[test]
fn a_load_that_changes_moves_currents_and_flips_nothing() {
    let heavier = BOARD.replace("RLOAD   bus    0      47", "RLOAD   bus    0      33");
    let folder = folder("values", &[("old.net", BOARD), ("new.net", &heavier)]);
    assert_eq!(show("moved", &folder, &["compare", "old.net", "new.net"]).code, 0);
    show("moved-more", &folder, &["compare", "old.net", "new.net", "--moved", "35%"]);
}

#[test]
fn accepted_findings_are_counted_and_listed() {
    let board = BOARD.replace("RLOAD   bus ", "RTEST   bus    tp1    1k\nRLOAD   bus ");
    let because = "*@ accept dangling-node tp1 because it is a test pad";
    let accepted = board.replace("*@ range", &format!("{because}\n*@ range"));
    let folder = folder("accepted", &[("a.net", &accepted), ("b.net", &board)]);
    assert_eq!(run_in(&folder, &["check", "b.net"]).code, 1);
    assert_eq!(show("accepted-counted", &folder, &["check", "a.net"]).code, 0);
    assert_eq!(show("accepted-listed", &folder, &["check", "a.net", "--accepted"]).code, 0);
    let silent = accepted.replace(" because it is a test pad", "");
    std::fs::write(folder.join("a.net"), silent).unwrap();
    assert_eq!(show("accepted-without-reason", &folder, &["check", "a.net"]).code, 1);
}

#[test]
fn two_directories_are_compared_file_by_file() {
    let turned = faulty();
    let folder = folder(
        "directories",
        &[
            ("main/charger.net", BOARD),
            ("main/lamp.net", "lamp\nV1 a 0 5\nR1 a 0 1k\n"),
            ("work/charger.net", &turned),
            ("work/pump.net", "pump\nV1 a 0 5\nR1 a 0 1M\n.include parts.cir\n"),
            ("work/parts.cir", "R2 a 0 2k\n"),
        ],
    );
    assert_eq!(show("directories", &folder, &["compare", "main", "work"]).code, 1);
}

#[test]
fn a_team_sets_levels_and_learns_of_slips() {
    let folder = folder(
        "settings",
        &[
            (
                "kneewise.toml",
                "fail-on = \"error\"\n\n[levels]\nnear-miss-nam = \"error\"\nnever-conducts = \"of\"\n",
            ),
            ("boards/charger.net", &faulty()),
        ],
    );
    show("settings-slips", &folder, &["check", "boards"]);
    let mended =
        "fail-on = \"error\"\n\n[levels]\nnear-miss-name = \"error\"\nbroken-expectation = \"off\"\n";
    std::fs::write(folder.join("kneewise.toml"), mended).unwrap();
    assert_eq!(show("settings-levels", &folder, &["check", "boards"]).code, 1);
}

#[test]
fn version_control_calls_the_comparison() {
    let folder = folder("git", &[("boards/charger.net", BOARD)]);
    let git = |arguments: &[&str]| {
        let program = Path::new(env!("CARGO_BIN_EXE_kneewise"));
        let path =
            format!("{}:{}", program.parent().unwrap().display(), std::env::var("PATH").unwrap_or_default());
        let identity = ["-c", "user.name=t", "-c", "user.email=t@example.org", "-c", "commit.gpgsign=false"];
        Command::new("git").args(identity).args(arguments).current_dir(&folder).env("PATH", path).output()
    };
    if !git(&["init", "-q", "."]).is_ok_and(|o| o.status.success()) {
        return;
    }
    // the two lines that the README asks for
    std::fs::write(folder.join(".gitattributes"), "*.net diff=kneewise\n").unwrap();
    git(&["config", "diff.kneewise.command", "kneewise compare"]).unwrap();
    git(&["add", "."]).unwrap();
    git(&["commit", "-qm", "first"]).unwrap();
    std::fs::write(folder.join("boards/charger.net"), faulty()).unwrap();
    std::fs::write(folder.join("boards/lamp.net"), "lamp\nV1 a 0 5\nR1 a 0 1M\n").unwrap();
    git(&["add", "-N", "boards/lamp.net"]).unwrap();
    let shown = git(&["diff"]).unwrap();
    let run = Run {
        out: String::from_utf8(shown.stdout).unwrap(),
        err: String::from_utf8(shown.stderr).unwrap(),
        code: shown.status.code().unwrap(),
    };
    assert_eq!(run.code, 0, "{}", run.err);
    screen("git-diff", &["compare", "(called by git diff)"], &run);
    assert!(!run.out.contains("Files that it includes"), "{}", run.out);

    // what it includes is read as it is now, and that is said
    std::fs::write(folder.join("boards/part.inc"), "R9 in 0 1k\n").unwrap();
    let board = format!("{}.include part.inc\n.end\n", BOARD.replace(".end\n", ""));
    std::fs::write(folder.join("boards/charger.net"), board).unwrap();
    let shown = String::from_utf8(git(&["diff", "boards/charger.net"]).unwrap().stdout).unwrap();
    assert!(shown.contains("Files that it includes were read as they are now"), "{shown}");
}

#[test]
fn what_may_not_be_written_is_told() {
    let folder = folder("refused", &[("charger.net", BOARD)]);
    let file = folder.join("charger.net");
    let mut permissions = std::fs::metadata(&file).unwrap().permissions();
    permissions.set_readonly(true);
    std::fs::set_permissions(&file, permissions).unwrap();
    assert_eq!(show("write-refused", &folder, &["annotate", "charger.net", "--write"]).code, 2);
    assert_eq!(std::fs::read_to_string(&file).unwrap(), BOARD);
}

#[test]
fn help_tells_what_there_is() {
    for name in ["check", "annotate", "compare"] {
        let arguments = [name, "--help"];
        let mut command = command(&arguments);
        let output = command.env("COLUMNS", "100").current_dir(root()).output().unwrap();
        let run = Run {
            out: String::from_utf8(output.stdout).unwrap(),
            err: String::from_utf8(output.stderr).unwrap(),
            code: output.status.code().unwrap(),
        };
        screen(&format!("help-{name}"), &arguments, &run);
    }
}

#[test]
fn completions_and_the_manual_page_are_made() {
    for shell in ["bash", "zsh", "fish", "powershell", "elvish"] {
        let run = run_in(root(), &["completions", shell]);
        assert!(run.code == 0 && run.out.contains("annotate"), "{shell}: {}", run.err);
    }
    let page = run_in(root(), &["manual"]).out;
    assert!(page.contains(".TH kneewise") && page.contains("verify"), "{page}");
    let overview = run_in(root(), &["--help"]).out;
    assert!(!overview.contains("completions"), "{overview}");
}
