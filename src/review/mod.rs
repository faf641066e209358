//! What a team does with the results of whole files: marks behind the diodes of a netlist, the comparison of two
//! revisions, and rewriting a file without ever losing it. Shows nothing: that is `report`'s.

mod annotate;
mod baseline;
mod compare;
mod figures;
mod mark;
mod record;
mod save;
mod wording;

pub use annotate::{
    Annotated, Change, FileMarks, Role, annotate, annotate_file, file_marks, strip, strip_part,
};
pub use baseline::Baseline;
pub use compare::{
    Comparison, FindingsChange, Move, Revision, StateChange, TrustChange, VerdictChange, WiringChange,
    compare,
};
pub use mark::marks;
pub use record::Record;
pub use save::{Desk, DiskDesk, SaveProblem, save};
