//! The command line program; everything it does is in `cli`.

mod cli;

fn main() -> std::process::ExitCode {
    cli::run()
}
