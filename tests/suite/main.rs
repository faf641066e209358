//! All tests that use the library from outside, in one binary: linking is what costs.

#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod expectations;
mod rule_examples;
mod wiring_facts;
