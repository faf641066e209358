//! Runs the program from the repository's root.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

/// What a run gave.
pub struct Run {
    pub out: String,
    pub err: String,
    pub code: i32,
}

pub fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

pub fn command(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_kneewise"));
    command.args(arguments).current_dir(root()).env_remove("NO_COLOR");
    command
}

fn finish(mut command: Command, input: &[u8]) -> Run {
    command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    let mut child = command.spawn().unwrap();
    // a program that does not read its input closes the pipe
    let _ = child.stdin.take().unwrap().write_all(input);
    let output = child.wait_with_output().unwrap();
    Run {
        out: String::from_utf8(output.stdout).unwrap(),
        err: String::from_utf8(output.stderr).unwrap(),
        code: output.status.code().unwrap(),
    }
}

/// Runs with these arguments and nothing on standard input.
pub fn run(arguments: &[&str]) -> Run {
    finish(command(arguments), b"")
}

/// Runs in a folder, with nothing on standard input.
pub fn run_in(folder: &Path, arguments: &[&str]) -> Run {
    let mut command = command(arguments);
    command.current_dir(folder);
    finish(command, b"")
}

/// Runs with this text on standard input.
pub fn feed(arguments: &[&str], input: &str) -> Run {
    finish(command(arguments), input.as_bytes())
}

/// Runs with an environment variable set.
pub fn run_with(arguments: &[&str], key: &str, value: &str) -> Run {
    let mut command = command(arguments);
    command.env(key, value);
    finish(command, b"")
}

/// A folder of this test's own, empty.
pub fn scratch(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).unwrap();
    folder
}
