//! One statement under the reading glass: its words with their text and their places.

use crate::syntax::{Broken, Fields, Token};
use crate::text::{FileId, Sources, Span};

/// A statement, its file's text and its fields.
pub(crate) struct Line<'t> {
    /// The text that tokens count in: the whole file's, or the statement's own.
    pub text: &'t str,
    /// Where that text begins in the file.
    pub base: u32,
    pub span: Span,
    pub fields: Fields,
}

impl<'t> Line<'t> {
    /// Reads the statement at `span`; `fields` is a buffer to reuse.
    pub fn read(sources: &'t Sources, span: Span, mut fields: Fields) -> (Self, Result<(), Broken>) {
        let text = sources.get(span.file).map_or("", |f| f.text.as_str());
        let outcome = fields.read(text, span.start, span.end);
        (Line { text, base: 0, span, fields }, outcome)
    }

    /// The place of a token.
    pub fn at(&self, token: Token) -> Span {
        Span { file: self.file(), start: self.base + token.start, end: self.base + token.end }
    }

    pub fn file(&self) -> FileId {
        self.span.file
    }

    /// The text of a token.
    pub fn str(&self, token: Token) -> &'t str {
        self.text.get(token.start as usize..token.end as usize).unwrap_or("")
    }

    /// The word of that number; 0 is the name at the head.
    pub fn word(&self, number: usize) -> Option<Token> {
        self.fields.words.get(number).copied()
    }

    /// Text of the word of that number; empty where there is none.
    pub fn word_str(&self, number: usize) -> &'t str {
        self.word(number).map_or("", |t| self.str(t))
    }

    /// Whether the word of that number is this word, in any case.
    pub fn is(&self, number: usize, word: &str) -> bool {
        self.word_str(number).eq_ignore_ascii_case(word)
    }

    /// Number of words.
    pub fn len(&self) -> usize {
        self.fields.words.len()
    }

    /// The value paired with that key, in any case; the last where it is given twice.
    pub fn pair(&self, key: &str) -> Option<Token> {
        let same = |t: Token| self.str(t).eq_ignore_ascii_case(key);
        self.fields.pairs.iter().rev().find(|p| same(p.key)).map(|p| p.value)
    }

    /// Place of the name at the head.
    pub fn head(&self) -> Span {
        self.word(0).map_or(self.span, |t| self.at(t))
    }
}
