//! All tests that use the library from outside, in one binary: linking is what costs.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod expectations;
mod over_time;
mod rule_examples;
mod trails;
mod wiring_facts;
