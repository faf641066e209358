//! All tests that use the library from outside, in one binary: linking is what costs.

mod rule_examples;
mod wiring_facts;
