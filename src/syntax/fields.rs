//! The tokens of one statement sorted into words in order and `key=value` pairs.

use super::tokens::{Broken, Token, TokenKind, joined_by_comma, tokens};

/// `pair = word "=" value`
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Pair {
    /// The name before the sign.
    pub key: Token,
    /// The word, expression or text behind it.
    pub value: Token,
}

/// One statement, sorted. Reused from line to line, so that reading a line allocates nothing.
#[derive(Debug, Clone, Default)]
pub struct Fields {
    /// All tokens in order.
    pub tokens: Vec<Token>,
    /// Words, expressions and texts that belong to no pair, in order; parentheses are left out.
    pub words: Vec<Token>,
    /// Pairs in order.
    pub pairs: Vec<Pair>,
    /// How many of `words` stand before the first pair or `params:`.
    pub words_before_pairs: usize,
}

impl Fields {
    /// Reads the logical line `from..to` of `text`.
    ///
    /// # Errors
    /// [`Broken`] where a brace or quote is never closed; what stands before it has been read.
    pub fn read(&mut self, text: &str, from: u32, to: u32) -> Result<(), Broken> {
        let outcome = tokens(text, from, to, &mut self.tokens);
        self.sort(text.as_bytes());
        outcome
    }

    fn sort(&mut self, text: &[u8]) {
        self.words.clear();
        self.pairs.clear();
        let mut before = None;
        let mut at = 0;
        while let Some(&token) = self.tokens.get(at) {
            at += 1;
            match token.kind {
                TokenKind::Open | TokenKind::Close | TokenKind::Equals => continue,
                _ => {}
            }
            // the word of a dot line is no key, whatever follows it
            let is_dot_word = at == 1 && text.get(token.start as usize) == Some(&b'.');
            let value = match self.tokens.get(at) {
                Some(sign) if sign.kind == TokenKind::Equals && !is_dot_word => {
                    self.tokens.get(at + 1).copied()
                }
                _ => None,
            };
            if let Some(value) = value.filter(|v| is_value(*v)) {
                before.get_or_insert(self.words.len());
                self.pairs.push(Pair { key: token, value });
                at += 2;
                at += self.more_values(text, at);
            } else if is_marker(text, token) {
                before.get_or_insert(self.words.len());
            } else {
                self.words.push(token);
            }
        }
        self.words_before_pairs = before.unwrap_or(self.words.len());
    }

    /// How many tokens from number `at` on belong to the value before them, in a list such as `tc=0.001,0.002`. A word
    /// with a sign of its own is the next key.
    fn more_values(&self, text: &[u8], at: usize) -> usize {
        let belongs = |n: &usize| match (self.tokens.get(at + n - 1), self.tokens.get(at + n)) {
            (Some(&left), Some(&right)) => {
                let next = self.tokens.get(at + n + 1);
                is_value(right)
                    && joined_by_comma(text, left, right)
                    && next.is_none_or(|sign| sign.kind != TokenKind::Equals)
            }
            _ => false,
        };
        (0..self.tokens.len()).take_while(belongs).count()
    }

    /// The number with a decimal comma (`0,1u`) that token `word` of `words` begins: both tokens' range.
    pub fn decimal_comma(&self, text: &str, word: usize) -> Option<(u32, u32)> {
        let bytes = text.as_bytes();
        let (left, right) = (*self.words.get(word)?, *self.words.get(word + 1)?);
        let digits = |t: Token| bytes.get(t.start as usize..t.end as usize).unwrap_or_default();
        let whole = digits(left);
        let unsigned = whole.strip_prefix(b"-").or(whole.strip_prefix(b"+")).unwrap_or(whole);
        let looks = !unsigned.is_empty()
            && unsigned.iter().all(u8::is_ascii_digit)
            && digits(right).first().is_some_and(u8::is_ascii_digit);
        (looks && joined_by_comma(bytes, left, right)).then_some((left.start, right.end))
    }
}

fn is_value(token: Token) -> bool {
    matches!(token.kind, TokenKind::Word | TokenKind::Expression | TokenKind::Text)
}

/// `marker = "params:" / "optional:" / "text:"`: the words before it are nodes or ports
fn is_marker(text: &[u8], token: Token) -> bool {
    let word = text.get(token.start as usize..token.end as usize).unwrap_or_default();
    let markers: [&[u8]; 3] = [b"params:", b"optional:", b"text:"];
    word.last() == Some(&b':') && markers.iter().any(|m| word.eq_ignore_ascii_case(m))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pairs_are_told_from_words() {
        let text = "X1 a b SUB params: r = 1k c={2*x}";
        let mut fields = Fields::default();
        fields.read(text, 0, u32::try_from(text.len()).unwrap()).unwrap();
        assert_eq!(fields.words.len(), 4);
        assert_eq!(fields.words_before_pairs, 4);
        assert_eq!(fields.pairs.len(), 2);
    }

    #[test]
    fn a_list_of_values_is_one_pair() {
        let text = "R1 a b 1k tc=0.001,0.002,m=2";
        let mut fields = Fields::default();
        fields.read(text, 0, u32::try_from(text.len()).unwrap()).unwrap();
        assert_eq!((fields.words.len(), fields.pairs.len()), (4, 2));
    }

    #[test]
    fn the_word_of_a_dot_line_is_no_key() {
        let mut fields = Fields::default();
        fields.read(".survey = 5 depth=3", 0, 19).unwrap();
        assert_eq!((fields.words.len(), fields.pairs.len()), (2, 1));
    }

    #[test]
    fn a_decimal_comma_is_seen() {
        let text = "C1 a b 0,1u";
        let mut fields = Fields::default();
        fields.read(text, 0, 11).unwrap();
        assert_eq!(fields.decimal_comma(text, 3), Some((7, 11)));
        assert_eq!(fields.decimal_comma(text, 2), None);
    }
}
