//! Marks on the disk: links, permissions, encodings, and rewriting that is killed, runs out of room or meets somebody
//! else. Afterwards the old or the new file is there, whole.

use crate::runner::{command, run_in, scratch};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::Duration;

const BOARD: &str = "lamp\r\nV1 in 0 5\r\nR1\tin a 1k  \r\nD1 a 0 DX\r\n*@ drop DX 0.7\r\n.model DX D";

fn marked() -> String {
    BOARD.replace("D1 a 0 DX", "D1 a 0 DX ;@ conducting 4.30mA 0.700V")
}

fn board(name: &str) -> (PathBuf, PathBuf) {
    let folder = scratch(&format!("marks-{name}"));
    let file = folder.join("a.net");
    std::fs::write(&file, BOARD).unwrap();
    (folder, file)
}

fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = std::fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

#[test]
fn written_twice_is_written_once() {
    let (folder, file) = board("twice");
    assert_eq!(run_in(&folder, &["annotate", "--write", "a.net"]).code, 0);
    assert_eq!(std::fs::read_to_string(&file).unwrap(), marked());
    let first = std::fs::metadata(&file).unwrap().modified().unwrap();
    assert_eq!(run_in(&folder, &["annotate", "--write", "a.net"]).code, 0);
    assert_eq!(std::fs::metadata(&file).unwrap().modified().unwrap(), first, "what is right is not written");
    assert_eq!(names(&folder), ["a.net"]);
    assert_eq!(run_in(&folder, &["annotate", "a.net"]).out, marked());
    assert_eq!(run_in(&folder, &["annotate", "--strip", "--write", "a.net"]).code, 0);
    assert_eq!(std::fs::read_to_string(&file).unwrap(), BOARD);
}

#[test]
fn verify_ends_with_1_where_a_mark_is_missing_or_wrong() {
    let (folder, file) = board("verify");
    assert_eq!(run_in(&folder, &["annotate", "--verify", "a.net"]).code, 1);
    std::fs::write(&file, marked().replace("4.30mA", "4.31mA")).unwrap();
    assert_eq!(run_in(&folder, &["annotate", "--verify", "a.net"]).code, 0, "one unit is noise");
    std::fs::write(&file, marked().replace("4.30mA", "4.40mA")).unwrap();
    let run = run_in(&folder, &["annotate", "--verify", "a.net"]);
    assert_eq!(run.code, 1);
    assert!(run.out.contains("a.net:4  D1\n") && run.out.contains("4.40mA"), "{}", run.out);
    assert_eq!(run_in(&folder, &["annotate", "--verify", "missing.net"]).code, 2);
    assert_eq!(run_in(&folder, &["annotate", "--verify", "missing.net", "a.net"]).code, 2);
}

#[test]
fn what_cannot_be_done_is_wrong_usage() {
    let (folder, _) = board("usage");
    for arguments in [
        &["annotate"][..],
        &["annotate", "a.net", "a.net"],
        &["annotate", "--write", "--verify", "a.net"],
        &["annotate", "--write", "-"],
    ] {
        let run = run_in(&folder, arguments);
        assert_eq!((run.code, run.out.as_str()), (2, ""), "{arguments:?}");
        assert!(!run.err.is_empty());
    }
}

/// A board with a part in a file of its own, and a second board that includes it the other way round.
fn boards(name: &str) -> PathBuf {
    let folder = scratch(&format!("marks-{name}"));
    std::fs::create_dir_all(folder.join("parts")).unwrap();
    std::fs::create_dir_all(folder.join(".git")).unwrap();
    std::fs::write(folder.join("parts/more.inc"), "D2 0 a DX\n").unwrap();
    let include = ".include parts/more.inc\r\n";
    std::fs::write(folder.join("a.net"), format!("{BOARD}\r\n{include}")).unwrap();
    std::fs::write(folder.join("b.net"), format!("{}\r\n{include}", BOARD.replace("0 5", "0 -5"))).unwrap();
    folder
}

fn more(folder: &Path) -> String {
    std::fs::read_to_string(folder.join("parts/more.inc")).unwrap()
}

#[test]
fn included_diodes_are_marked_too() {
    let folder = boards("included");
    let shown = run_in(&folder, &["annotate", "a.net"]);
    assert!(
        shown.err.contains("1 diode in parts/more.inc, which it includes; --write marks"),
        "{}",
        shown.err
    );
    assert_eq!(shown.out, format!("{}\r\n.include parts/more.inc\r\n", marked()));
    let verified = run_in(&folder, &["annotate", "--verify", "a.net"]);
    assert_eq!(verified.code, 1);
    assert!(verified.out.contains("parts/more.inc:1  D2\n"), "{}", verified.out);
    let written = run_in(&folder, &["annotate", "--write", "a.net"]);
    assert_eq!((written.code, written.err.as_str()), (0, ""));
    assert_eq!(more(&folder), "D2 0 a DX ;@ blocking -0.700V\n");
    assert_eq!(std::fs::read_to_string(folder.join("a.net")).unwrap(), shown.out);
    assert_eq!(run_in(&folder, &["annotate", "--verify", "a.net"]).code, 0);
    // the mark of one netlist is not that of two
    assert_eq!(run_in(&folder, &["annotate", "--verify", "b.net"]).code, 1);
    assert_eq!(run_in(&folder, &["annotate", "--strip", "--write", "a.net"]).code, 0);
    assert_eq!(more(&folder), "D2 0 a DX\n");
}

#[test]
fn a_part_of_several_netlists_is_written_once_and_speaks_for_all() {
    let folder = boards("shared");
    assert_eq!(run_in(&folder, &["annotate", "--write", "a.net", "b.net"]).code, 0);
    let both = "D2 0 a DX ;@ in 2 instances: 1 blocking | 1 conducting 4.30mA\n";
    assert_eq!(more(&folder), both);
    assert_eq!(run_in(&folder, &["annotate", "--verify", "."]).code, 0);
    assert_eq!(run_in(&folder, &["annotate", "--verify", "a.net"]).code, 1);
    // found in a directory, what another netlist includes is a part of it
    std::fs::rename(folder.join("parts/more.inc"), folder.join("parts/more.net")).unwrap();
    for board in ["a.net", "b.net"] {
        let text = std::fs::read_to_string(folder.join(board)).unwrap().replace("more.inc", "more.net");
        std::fs::write(folder.join(board), text).unwrap();
    }
    let run = run_in(&folder, &["annotate", "--verify", "."]);
    assert_eq!((run.code, run.out.as_str()), (0, ""));
    assert_eq!(run_in(&folder, &["annotate", "--strip", "--write", "."]).code, 0);
    assert_eq!(std::fs::read_to_string(folder.join("parts/more.net")).unwrap(), "D2 0 a DX\n");
    assert_eq!(names(&folder.join("parts")), ["more.net"]);
}

#[test]
fn a_part_from_outside_of_the_project_stays_as_it_is() {
    let folder = boards("outside");
    let outside = scratch("marks-outside-library");
    std::fs::write(outside.join("far.inc"), "D3 a 0 DX\n").unwrap();
    let text = std::fs::read_to_string(folder.join("a.net")).unwrap();
    std::fs::write(folder.join("a.net"), format!("{text}.include far.inc\n")).unwrap();
    let run = run_in(&folder, &["annotate", "--write", "a.net", "--include-dir", outside.to_str().unwrap()]);
    assert_eq!(run.code, 0, "{}", run.err);
    assert!(run.err.contains("from outside of its project, has no mark"), "{}", run.err);
    assert_eq!(std::fs::read_to_string(outside.join("far.inc")).unwrap(), "D3 a 0 DX\n");
    assert!(more(&folder).contains(";@"));
}

#[test]
fn a_part_that_cannot_be_written_is_told_and_hides_no_other() {
    let folder = boards("part-refused");
    let part = folder.join("parts/more.inc");
    let mut permissions = std::fs::metadata(&part).unwrap().permissions();
    permissions.set_readonly(true);
    std::fs::set_permissions(&part, permissions).unwrap();
    let run = run_in(&folder, &["annotate", "--write", "a.net"]);
    assert_eq!(run.code, 2);
    assert!(run.err.contains("parts/more.inc stays as it was: it is read-only"), "{}", run.err);
    assert_eq!(more(&folder), "D2 0 a DX\n");
    assert!(std::fs::read_to_string(folder.join("a.net")).unwrap().contains(";@ conducting"));
}

#[test]
fn a_directory_is_only_written_or_verified() {
    let folder = boards("directory");
    let run = run_in(&folder, &["annotate", "."]);
    assert_eq!((run.code, run.out.as_str()), (2, ""));
    assert!(run.err.contains("add --write or --verify"), "{}", run.err);
}

#[cfg(unix)]
#[test]
fn links_stay_links_and_permissions_stay() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    let (folder, file) = board("links");
    std::fs::create_dir(folder.join("far")).unwrap();
    let target = folder.join("far/real.net");
    std::fs::rename(&file, &target).unwrap();
    symlink("far/real.net", &file).unwrap();
    std::fs::set_permissions(&target, std::fs::Permissions::from_mode(0o640)).unwrap();
    assert_eq!(run_in(&folder, &["annotate", "--write", "a.net"]).code, 0);
    assert!(std::fs::symlink_metadata(&file).unwrap().file_type().is_symlink());
    assert_eq!(std::fs::read_to_string(&target).unwrap(), marked());
    assert_eq!(std::fs::metadata(&target).unwrap().permissions().mode() & 0o7777, 0o640);
    assert_eq!(names(&folder.join("far")), ["real.net"]);
}

/// A board so large that rewriting it takes a while.
fn large() -> String {
    let diodes: String = (0..400).map(|n| format!("R{n} in n{n} 1k\nD{n} n{n} 0 DX\n")).collect();
    format!("lamps\nV1 in 0 5\n*@ drop DX 0.7\n.model DX D\n{diodes}* {}\n", "x".repeat(300_000))
}

#[test]
fn killed_at_any_moment_the_old_or_the_new_file_is_there() {
    let folder = scratch("marks-killed");
    let file = folder.join("a.net");
    let old = large();
    std::fs::write(&file, &old).unwrap();
    let new = run_in(&folder, &["annotate", "a.net"]).out;
    assert_ne!(old, new);
    let start = std::time::Instant::now();
    assert_eq!(run_in(&folder, &["annotate", "--write", "a.net"]).code, 0);
    let whole = start.elapsed();
    for part in 1..=12 {
        std::fs::write(&file, &old).unwrap();
        let mut child = command(&["annotate", "--write", "a.net"])
            .current_dir(&folder)
            .stdin(Stdio::null())
            .spawn()
            .unwrap();
        std::thread::sleep(whole.mul_f64(f64::from(part) / 11.0).min(Duration::from_millis(600)));
        // it may be done already
        let _ = child.kill();
        child.wait().unwrap();
        let there = std::fs::read_to_string(&file).unwrap();
        assert!(there == old || there == new, "part {part}: {} bytes", there.len());
    }
}

/// Kills the program at the n-th call of each system call that rewriting makes, where the machine has `strace`.
#[test]
fn killed_at_every_system_call_the_old_or_the_new_file_is_there() {
    let traced = |folder: &Path, inject: &str| {
        let mut strace = Command::new("strace");
        strace.args(["-f", "-qq", "-o", "/dev/null", "-e", inject]);
        strace.arg(env!("CARGO_BIN_EXE_kneewise")).args(["annotate", "--write", "a.net"]);
        strace.current_dir(folder).stdin(Stdio::null()).stdout(Stdio::null()).stderr(Stdio::null()).status()
    };
    let (folder, file) = board("strace");
    if !traced(&folder, "trace=rename").is_ok_and(|status| status.success()) {
        return;
    }
    assert_eq!(std::fs::read_to_string(&file).unwrap(), marked());
    let (mut olds, mut news) = (0, 0);
    for call in ["openat", "read", "write", "fchown", "fchmod", "fsync", "close", "rename", "unlink", "statx"]
    {
        for number in 1..=40 {
            std::fs::write(&file, BOARD).unwrap();
            let inject = format!("inject={call}:signal=KILL:when={number}");
            let was_killed = !traced(&folder, &inject).unwrap().success();
            let there = std::fs::read_to_string(&file).unwrap();
            assert!(there == BOARD || there == marked(), "{call} {number}: {there:?}");
            if !was_killed {
                break;
            }
            if there == BOARD { olds += 1 } else { news += 1 }
        }
    }
    assert!(olds > 10 && news > 0, "{olds} times the old file, {news} times the new one");
}

/// Every system call that rewriting makes says that there is no room, or that it may not, where the machine has
/// `strace`: then the file is as it was, the exit code is 2, and the message says so.
#[test]
fn refused_at_every_system_call_the_file_is_as_it_was_and_it_is_told() {
    let (folder, file) = board("refused");
    let traced = |inject: &str| {
        let mut strace = Command::new("strace");
        strace.args(["-f", "-qq", "-o", "/dev/null", "-e", inject]);
        strace.arg(env!("CARGO_BIN_EXE_kneewise")).args(["annotate", "--write", "a.net"]);
        strace.current_dir(&folder).stdin(Stdio::null()).output()
    };
    if !traced("trace=rename").is_ok_and(|output| output.status.success()) {
        return;
    }
    // the flags of an open that makes a new file cannot be picked, so the whole call is tried by number below
    for (call, error) in [
        ("fchmod", "EPERM"),
        ("fsync", "ENOSPC"),
        ("fsync", "EIO"),
        ("rename", "EACCES"),
        ("rename", "ENOSPC"),
    ] {
        std::fs::write(&file, BOARD).unwrap();
        let output = traced(&format!("inject={call}:error={error}:when=1")).unwrap();
        let told = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(2), "{call} {error}: {told}");
        assert!(told.contains("a.net stays as it was: "), "{call} {error}: {told}");
        assert_eq!(std::fs::read_to_string(&file).unwrap(), BOARD, "{call} {error}");
        assert_eq!(names(&folder), ["a.net"], "{call} {error}");
    }
}

/// A full disk: a small file system in memory, where one may be mounted; elsewhere the tests beside `save` stand in.
#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_loses_nothing() {
    let folder = scratch("marks-full");
    let mount = |arguments: &[&str]| Command::new("mount").args(arguments).arg(&folder).output();
    if !mount(&["-t", "tmpfs", "-o", "size=16k", "none"]).is_ok_and(|o| o.status.success()) {
        return;
    }
    let file = folder.join("a.net");
    let padded = format!("{BOARD}\n* {}\n", "x".repeat(7000));
    let written = std::fs::write(&file, &padded);
    // the rest of the room is taken
    let _ = std::fs::write(folder.join("ballast"), vec![0u8; 64 << 10]);
    let run = run_in(&folder, &["annotate", "--write", "a.net"]);
    let there = std::fs::read_to_string(&file);
    let left = names(&folder);
    let _ = Command::new("umount").arg(&folder).output();
    written.unwrap();
    assert_eq!(run.code, 2, "{}", run.err);
    assert!(run.err.contains("a.net stays as it was: "), "{}", run.err);
    assert_eq!(there.unwrap(), padded);
    assert_eq!(left, ["a.net", "ballast"]);
}

/// Somebody else writes the file while the new one is on its way to the disk: his bytes stay.
#[test]
fn what_changes_underneath_is_not_lost() {
    let (folder, file) = board("underneath");
    let mut strace = Command::new("strace");
    // long enough to see the new file appear beside the old one
    strace.args(["-f", "-qq", "-o", "/dev/null", "-e", "inject=fsync:delay_enter=500000:when=1"]);
    strace.arg(env!("CARGO_BIN_EXE_kneewise")).args(["annotate", "--write", "a.net"]).current_dir(&folder);
    let Ok(child) = strace.stdin(Stdio::null()).stderr(Stdio::piped()).spawn() else { return };
    let begun = std::time::Instant::now();
    while names(&folder).len() < 2 && begun.elapsed() < Duration::from_secs(20) {
        std::thread::sleep(Duration::from_millis(2));
    }
    std::fs::write(&file, "somebody else's\n").unwrap();
    let output = child.wait_with_output().unwrap();
    let told = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(2), "{told}");
    assert!(told.contains("somebody has changed it in the meantime"), "{told}");
    assert_eq!(std::fs::read_to_string(&file).unwrap(), "somebody else's\n");
    assert_eq!(names(&folder), ["a.net"]);
}
