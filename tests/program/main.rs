//! Tests of the built program, as a person or a pipeline runs it: streams, exit codes, formats, the demo
//! netlists and the pages of the README.

#![allow(clippy::unwrap_used, clippy::panic)]

mod against;
mod arguments;
mod compare;
mod fixtures;
mod marks;
mod readme;
mod review;
mod runner;
mod sarif;
mod schemas;
mod settings;
mod streams;
