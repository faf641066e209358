//! Seeded faults: clean netlists of the buoy, mistakes put into them one at a time, and the share that `check` finds.
//! Which mutants are no mistakes is for `judge` to say, which never sees kneewise.
//!
//! An ordinary run takes a sample of each operator. `KNEEWISE_FAULTS=all cargo test --test outside faults -- --nocapture`
//! makes and judges every mutant and prints the table; `KNEEWISE_FAULTS=held-out` does so over the netlists of
//! `held-out`. Those stand apart from the ones that the rules were written against, but no file here may give a warning,
//! and where one of them did its rule was mended: a second sample, not a blind one. `KNEEWISE_MISSED=1` lists what was
//! missed.

mod instrument;
mod isomorphic;
mod judge;
mod march;
mod mutate;
mod netlist;
mod roles;
mod states;
mod table;
