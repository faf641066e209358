//! Holds the reader against the grammar in `grammar/`: sentences made from it are read, broken inputs are told, and
//! what must hold for any text is tried on random ones. One binary, so that it links once.

// helpers outside #[test] functions may stop a test just as the tests themselves do
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod abnf;
mod broken;
mod files;
mod printer;
mod properties;
mod review;
#[allow(dead_code, reason = "other binaries use more of it")]
#[path = "../circuits/seed.rs"]
mod seed;
mod sentence;
mod sentences;
