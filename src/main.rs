//! The command line program; everything it does is in `cli`.
fn main() {}
