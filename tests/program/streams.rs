//! Standard output, standard error, colour and closed pipes.

use crate::runner::{command, feed, run, run_with};
use std::io::{Read, Write};
use std::process::Stdio;

const NO_GROUND: &str = "Sounder supply\nV1 vin ret 5\nR1 vin ret 330\n.end\n";

#[test]
fn no_colour_on_a_pipe_unless_asked_for() {
    assert!(!feed(&["check", "-"], NO_GROUND).out.contains('\x1b'));
    assert!(feed(&["check", "-", "--color", "always"], NO_GROUND).out.contains("\x1b[1;31merror\x1b[0m"));
    assert!(!feed(&["check", "-", "--color", "never"], NO_GROUND).out.contains('\x1b'));
}

#[test]
fn no_color_is_obeyed() {
    // `script` of util-linux gives the program a terminal; elsewhere only the pipe can be tested
    let program = env!("CARGO_BIN_EXE_kneewise");
    let on_terminal = |no_color: &str| {
        let line = format!("{no_color} {program} rules");
        let output = std::process::Command::new("script")
            .args(["-q", "-e", "-c", &line, "/dev/null"])
            .env_remove("NO_COLOR")
            .stdin(Stdio::null())
            .output();
        output.ok().filter(|o| o.status.success()).map(|o| String::from_utf8_lossy(&o.stdout).into_owned())
    };
    if let (Some(coloured), Some(plain)) = (on_terminal(""), on_terminal("NO_COLOR=1")) {
        assert!(coloured.contains('\x1b'), "{coloured}");
        assert!(!plain.contains('\x1b'), "{plain}");
    }
    assert!(!run_with(&["rules"], "NO_COLOR", "1").out.contains('\x1b'));
}

#[test]
fn a_closed_pipe_is_no_error() {
    let mut child = command(&["check", "-", "--fail-on", "error"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    // far more than a pipe holds: every resistor is told to be a milliohm
    let mut netlist = String::from("t\nV1 a 0 1\n");
    for n in 0..5000 {
        netlist.push_str(&format!("R{n} a 0 1M\n"));
    }
    child.stdin.take().unwrap().write_all(netlist.as_bytes()).unwrap();
    let mut err = String::new();
    child.stderr.take().unwrap().read_to_string(&mut err).unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(0), "{err}");
    assert_eq!(err, "");
}

#[test]
fn hostile_text_never_reaches_the_terminal() {
    let netlist = "t\nR1 a\u{1b}[2J 0 1M\nV1 a\u{1b}[2J 0 5\n!\u{1b}]0;x\u{7}\n";
    let run = feed(&["check", "-"], netlist);
    assert!(!run.out.contains(['\x1b', '\x07']), "{:?}", run.out);
}

#[test]
fn two_runs_give_the_same_bytes() {
    for format in ["text", "json"] {
        // faulty and sound netlists, several ranges, instances: whatever is kept by hash somewhere
        for arguments in [
            &["check", "fixtures", "--format", format][..],
            &["states", "fixtures/beacon-strings.net", "--format", format],
            &["states", "fixtures/solar-or-battery.net", "--format", format],
            &["states", "fixtures/shared-split-fault.net", "--format", format],
        ] {
            let first = run(arguments).out;
            assert!(!first.is_empty());
            assert_eq!(first, run(arguments).out, "{arguments:?}");
        }
    }
}

#[test]
fn running_text_is_broken_where_the_terminal_ends() {
    let program = env!("CARGO_BIN_EXE_kneewise");
    let line = format!("stty cols 60 rows 20; {program} rules never-conducts");
    let output = std::process::Command::new("script")
        .args(["-q", "-e", "-c", &line, "/dev/null"])
        .env("NO_COLOR", "1")
        .stdin(Stdio::null())
        .output();
    let Some(output) = output.ok().filter(|o| o.status.success()) else { return };
    let text = String::from_utf8_lossy(&output.stdout);
    let widest = text.lines().map(|l| l.trim_end().chars().count()).max().unwrap_or(0);
    assert!((30..=60).contains(&widest), "{widest} columns:\n{text}");
}
