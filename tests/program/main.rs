//! Tests of the built program, as a person or a pipeline runs it: streams, exit codes, formats, the demo
//! netlists and the pages of the README.

#![allow(clippy::unwrap_used, clippy::panic)]

mod arguments;
mod fixtures;
mod readme;
mod runner;
mod schemas;
mod streams;
