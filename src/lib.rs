//! kneewise reads a circuit netlist and answers, from the text alone: is it wired properly, which way does
//! every diode point, and which state is it in under every supply condition.
//!
//! The pipeline, in the order of the modules (each imports only from those above it):
//! 1. [`text`]: files, spans, positions. 2. [`complementarity`]: piecewise-linear networks as mathematics.
//! 3. [`finding`]: findings as plain data. 4. [`config`]: options. 5. [`syntax`]: text to statements.
//! 6. [`circuit`]: statements to a flat circuit. 7. [`topology`]: facts of the wiring.
//! 8. [`operating`]: states for each condition, with proof. 9. [`swing`]: the same over time and over ranges.
//! 10. [`rules`]: one file a rule. 11. [`analysis`]: runs the stages in order and owns every result.
//! 12. [`report`]: terminal and JSON.
//!
//! Start reading at [`analysis`].
//!
//! ```
//! use kneewise::{analysis::analyse, config::Options, operating::State, text::Memory};
//! use std::path::Path;
//!
//! let netlist = "charge indicator of a buoy\nV1 in 0 5\nR1 in a 1k\nD1 a 0 DX\n.model DX D\n*@ drop DX 0.7\n";
//! let options = Options { states: true, ..Options::default() };
//! let analysis = analyse(&mut Memory::with("board.net", netlist), Path::new("board.net"), &options)
//!     .map_err(|problem| problem.0)?;
//! let cases = analysis.operating.unwrap_or_default().cases;
//! let diode = &cases[0].solutions[0].diodes[0];
//! assert_eq!(diode.state, State::Conducting);
//! assert!(diode.current.known().is_some_and(|amperes| (amperes - 4.3e-3).abs() < 1e-12));
//! # Ok::<(), String>(())
//! ```

pub mod text;

pub mod complementarity;

pub mod finding;

pub mod config;

pub mod syntax;

pub mod circuit;

pub mod topology;

pub mod operating;

pub mod swing;

pub mod rules;

pub mod analysis;

pub mod review;

pub mod report;
