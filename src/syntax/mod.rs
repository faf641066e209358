//! Text to statements. Never fails: what cannot be read is reported and the next line is read. One function
//! per grammar production, of the same name. Nothing here knows what an element does.

mod blank;
mod expression;
mod fields;
mod lines;
mod note;
mod number;
mod tokens;
mod unit;

pub use expression::{Binary, Expression, ExpressionProblem, expression};
pub use fields::{Fields, Pair};
pub use lines::{Line, LineKind, Lines, lines};
pub use note::{ExpectText, HoldWord, NOTE_WORDS, NoteProblem, NoteText, NoteWord, note};
pub use number::{Number, number, plain_number};
pub use tokens::{Broken, Token, TokenKind, tokens};
pub use unit::{Behind, Unit, behind, number_meant, sound_number};
