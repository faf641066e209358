//! Files, spans and positions. The only place that decodes bytes and the only place that counts lines and
//! columns from 1. Nothing here knows what a netlist is.

mod decode;
mod encode;
mod loader;
mod nearest;
mod span;
pub mod trouble;

pub use decode::{Encoding, decode};
pub use encode::{encode, original_offsets};
pub use loader::{Disk, LONGEST_FILE, LoadProblem, Loader, Memory, bounded};
pub use nearest::nearest;
pub use span::{FileId, Position, SourceFile, Sources, Span};
