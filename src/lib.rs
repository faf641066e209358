//! kneewise reads a circuit netlist and answers, from the text alone: is it wired properly, which way does
//! every diode point, and which state is it in under every supply condition.
//!
//! The pipeline, in the order of the modules (each imports only from those above it):
//! 1. [`text`]: files, spans, positions. 2. [`complementarity`]: piecewise-linear networks as mathematics.
//! 3. [`finding`]: findings as plain data. 4. [`config`]: options. 5. [`syntax`]: text to statements.
//! 6. [`circuit`]: statements to a flat circuit. 7. [`topology`]: facts of the wiring.
//! 8. [`operating`]: states for each condition, with proof. 9. [`rules`]: one file a rule.
//! 10. [`analysis`]: runs the stages in order and owns every result. 11. [`report`]: terminal and JSON.
//!
//! Start reading at [`analysis`].

pub mod text;

pub mod complementarity;

pub mod finding;

pub mod config;

pub mod syntax;

pub mod circuit;

pub mod topology;

pub mod operating;

pub mod rules;

pub mod analysis;

pub mod report;
