//! Checks against the outside world: published worked examples, an exhaustive enumeration in exact arithmetic that
//! shares no code with kneewise, and theorems about such networks. One binary, so that it links once.

// helpers outside #[test] functions may stop a test just as the tests themselves do
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic, clippy::print_stderr)]

mod circuits;
mod oracle;

#[path = "outside/compare.rs"]
mod compare;
#[path = "outside/dependent.rs"]
mod dependent;
#[path = "outside/enumeration.rs"]
mod enumeration;
#[path = "outside/examples.rs"]
mod examples;
#[path = "outside/exponential.rs"]
mod exponential;
#[path = "outside/families.rs"]
mod families;
#[path = "faults/mod.rs"]
mod faults;
#[path = "outside/run.rs"]
mod run;
#[path = "outside/shorts.rs"]
mod shorts;
#[path = "outside/shrink.rs"]
mod shrink;
#[path = "outside/theorems.rs"]
mod theorems;
#[path = "outside/time.rs"]
mod time;
