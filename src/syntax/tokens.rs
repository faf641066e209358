//! One logical line to words, expressions, quoted texts and signs.

use super::blank::{blank, is_hard_space};
use super::expression::is_in_names;
use nom::IResult;

/// What a token is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TokenKind {
    /// A name, a number, a word.
    Word,
    /// `{…}` or `'…'`, delimiters included.
    Expression,
    /// `"…"`, quotes included.
    Text,
    /// `=`.
    Equals,
    /// `(`.
    Open,
    /// `)`.
    Close,
}

/// A token as a byte range of its file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Token {
    /// First byte.
    pub start: u32,
    /// One past the last byte.
    pub end: u32,
    /// What it is.
    pub kind: TokenKind,
}

/// Where and why a line could not be cut into tokens.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Broken {
    /// First byte of what could not be read, to the line's end.
    pub start: u32,
    /// In a few words.
    pub what: &'static str,
}

/// `statement = *( blank token )`: cuts the logical line `from..to` of `text` into `out` (cleared first).
///
/// # Errors
/// [`Broken`] where a brace or quote is never closed; the tokens before it are in `out`.
pub fn tokens(text: &str, from: u32, to: u32, out: &mut Vec<Token>) -> Result<(), Broken> {
    out.clear();
    let bytes = text.as_bytes();
    let mut rest = bytes.get(from as usize..to as usize).unwrap_or_default();
    let offset = |rest: &[u8]| to - u32::try_from(rest.len()).unwrap_or(0);
    let mut place = Place::of(rest);
    loop {
        if let Ok((next, ())) = separator(rest) {
            rest = next;
        }
        if rest.is_empty() {
            return Ok(());
        }
        let start = offset(rest);
        match token(rest) {
            Ok((next, kind)) => {
                let more = if kind == TokenKind::Word {
                    place.wrapped_end(rest, rest.len() - next.len())
                } else {
                    0
                };
                place.pass(kind);
                rest = next.get(more..).unwrap_or_default();
                out.push(Token { start, end: offset(rest), kind });
            }
            Err(_) => return Err(Broken { start, what: unclosed(rest) }),
        }
    }
}

/// Where in its statement a word stands, to tell a node's name such as `Net-(D1-A)` from `SIN(0 1 50)`.
struct Place {
    /// First letter of the statement, in lower case.
    letter: u8,
    /// Words so far.
    words: usize,
}

impl Place {
    fn of(statement: &[u8]) -> Self {
        let first = separator(statement).ok().and_then(|(rest, ())| rest.first().copied());
        Place { letter: first.unwrap_or(0).to_ascii_lowercase(), words: 0 }
    }

    fn pass(&mut self, kind: TokenKind) {
        self.words += usize::from(matches!(kind, TokenKind::Word | TokenKind::Expression));
    }

    /// `wrapped-name = name 1*( "(" 1*inner ")" *name-char )`: schematic editors write `Net-(D1-A)` and
    /// `unconnected-(U1-~{EN}-Pad3)`. How far a name whose first `length` bytes are read goes on.
    fn wrapped_end(&self, input: &[u8], length: usize) -> usize {
        let head = input.get(..length).unwrap_or_default();
        let mut at = length;
        loop {
            match input.get(at) {
                Some(b'{') if input.get(at.wrapping_sub(1)) == Some(&b'~') => {}
                Some(b'(') if self.takes_node(head) => {}
                _ => return at - length,
            }
            let Some(end) = closed(&input[at..]) else { return at - length };
            at += end;
            at += word(&input[at..]).map_or(0, |(rest, _)| input.len() - at - rest.len());
        }
    }

    /// Whether a word here is a node, and not what a source or a model begins with.
    fn takes_node(&self, head: &[u8]) -> bool {
        let is_plain = head.iter().all(|b| b.is_ascii_alphanumeric() || *b == b'_');
        match self.letter {
            b'r' | b'c' | b'l' | b'v' | b'i' | b'd' | b'b' | b'f' | b'h' | b'w' => {
                (1..=2).contains(&self.words)
            }
            b'q' | b'j' | b'm' | b't' | b's' => (1..=4).contains(&self.words),
            // behind the law's words stand further nodes, and numbers
            b'e' | b'g' => match self.words {
                0 => false,
                1 | 2 => true,
                3 | 4 => !is_law(head),
                _ => !is_plain,
            },
            // a function of .func and .param may have any letters in its name
            b'.' => self.words >= 1 && !head.iter().all(|&b| is_in_names(b)),
            _ => self.words >= 1 && !is_plain,
        }
    }
}

/// Whether a word in the place of a controlled source's third node begins its law instead, as in `POLY(1)`.
fn is_law(head: &[u8]) -> bool {
    let laws: [&[u8]; 12] = [
        b"poly",
        b"table",
        b"value",
        b"laplace",
        b"freq",
        b"chebyshev",
        b"pwl",
        b"vol",
        b"cur",
        b"delay",
        b"v",
        b"i",
    ];
    laws.iter().any(|law| head.eq_ignore_ascii_case(law))
}

/// The length of what is enclosed from the first byte to its counterpart, if a name can hold it: no white space, no
/// sign and no comma.
fn closed(input: &[u8]) -> Option<usize> {
    let mut depth = 0usize;
    for (n, byte) in input.iter().enumerate() {
        match byte {
            b'(' | b'{' => depth += 1,
            b')' | b'}' => depth -= 1,
            0..=b' ' | b'=' | b',' | b';' | b'\'' | b'"' => return None,
            _ => {}
        }
        if depth == 0 {
            return (n > 1).then_some(n + 1);
        }
    }
    None
}

fn unclosed(rest: &[u8]) -> &'static str {
    match rest.first() {
        Some(b'{') => "a brace is opened here and never closed",
        Some(b'}') => "a brace is closed here that was never opened",
        _ => "a quote is opened here and never closed",
    }
}

/// `separator = blank *( "," blank )`: commas between words are blanks.
fn separator(input: &[u8]) -> IResult<&[u8], (), ()> {
    let (mut input, ()) = blank(input)?;
    while let Some(rest) = input.strip_prefix(b",") {
        (input, ()) = blank(rest)?;
    }
    Ok((input, ()))
}

/// `token = word / expression / quoted / "=" / "(" / ")"`
fn token(input: &[u8]) -> IResult<&[u8], TokenKind, ()> {
    match input.first() {
        Some(b'=') => Ok((&input[1..], TokenKind::Equals)),
        Some(b'(') => Ok((&input[1..], TokenKind::Open)),
        Some(b')') => Ok((&input[1..], TokenKind::Close)),
        Some(b'{') => braced(input),
        Some(b'\'') => quoted(input, b'\'', TokenKind::Expression),
        Some(b'"') => quoted(input, b'"', TokenKind::Text),
        _ => word(input),
    }
}

/// `word = 1*name-char`
fn word(input: &[u8]) -> IResult<&[u8], TokenKind, ()> {
    let mut length = 0;
    loop {
        let rest = input.get(length..).unwrap_or_default();
        length += rest.iter().position(|&b| !is_name_char(b)).unwrap_or(rest.len());
        if input.get(length) != Some(&0xC2) || is_hard_space(input, length) {
            break;
        }
        // another character that begins with this byte
        length += 2;
    }
    if length == 0 {
        return Err(nom::Err::Error(()));
    }
    Ok((input.get(length..).unwrap_or_default(), TokenKind::Word))
}

/// `name-char`: any printable character but white space, `=`, `,`, `;`, parentheses, quotes and braces. The byte that
/// a hard space begins with is left to [`word`]. A parenthesis that opens inside a name belongs to it, see
/// [`Place::wrapped_end`].
fn is_name_char(byte: u8) -> bool {
    const TABLE: [bool; 256] = {
        let mut table = [true; 256];
        let mut n = 0;
        while n < 256 {
            table[n] = !matches!(
                n as u8,
                0..=b' ' | b'=' | b',' | b';' | b'(' | b')' | b'\'' | b'"' | b'{' | b'}' | 0xC2
            );
            n += 1;
        }
        table
    };
    TABLE[byte as usize]
}

/// `braced = "{" *( any / braced ) "}"`
fn braced(input: &[u8]) -> IResult<&[u8], TokenKind, ()> {
    let mut depth = 0usize;
    for (n, byte) in input.iter().enumerate() {
        match byte {
            b'{' => depth += 1,
            b'}' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            return Ok((&input[n + 1..], TokenKind::Expression));
        }
    }
    Err(nom::Err::Error(()))
}

/// `quoted = quote *any quote`
fn quoted(input: &[u8], quote: u8, kind: TokenKind) -> IResult<&[u8], TokenKind, ()> {
    match memchr::memchr(quote, &input[1..]) {
        Some(n) => Ok((&input[n + 2..], kind)),
        None => Err(nom::Err::Error(())),
    }
}

/// Whether two tokens are joined by one comma and nothing else, as in `0,1u`.
pub(super) fn joined_by_comma(text: &[u8], left: Token, right: Token) -> bool {
    left.end + 1 == right.start && text.get(left.end as usize) == Some(&b',')
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cut(text: &str) -> Vec<&str> {
        let mut out = Vec::new();
        tokens(text, 0, u32::try_from(text.len()).unwrap(), &mut out).unwrap();
        out.iter().map(|t| &text[t.start as usize..t.end as usize]).collect()
    }

    #[test]
    fn names_keep_their_punctuation() {
        assert_eq!(
            cut("R1 +24V a[3] /VOUT y#2 <0> 1k;end"),
            ["R1", "+24V", "a[3]", "/VOUT", "y#2", "<0>", "1k"]
        );
    }

    #[test]
    fn a_parenthesis_inside_a_name_belongs_to_it() {
        assert_eq!(
            cut("D1 Net-(D1-A) unconnected-(U1-~{EN}-Pad3) DX"),
            ["D1", "Net-(D1-A)", "unconnected-(U1-~{EN}-Pad3)", "DX"]
        );
        assert_eq!(cut("R1 (Net-(R1-Pad1),/~{RST}) 1k"), ["R1", "(", "Net-(R1-Pad1)", "/~{RST}", ")", "1k"]);
        assert_eq!(cut("R1 data(3) data(4) 1k"), ["R1", "data(3)", "data(4)", "1k"]);
        assert_eq!(cut("E1 p 0 x(1) 0 2"), ["E1", "p", "0", "x(1)", "0", "2"]);
        assert_eq!(cut("X1 Net-(U1-IN(A)) 0 OPA"), ["X1", "Net-(U1-IN(A))", "0", "OPA"]);
    }

    #[test]
    fn a_parenthesis_behind_a_word_of_the_language_does_not() {
        assert_eq!(cut("V1 a 0 SIN(0 1 50)").len(), 9);
        assert_eq!(cut("V1 a 0 DC(5)"), ["V1", "a", "0", "DC", "(", "5", ")"]);
        assert_eq!(cut("E1 o 0 POLY(1) a 0 0 1").len(), 11);
        assert_eq!(cut("E1 o 0 POLY(1) Net-(a) 0 0 1").len(), 11);
        assert_eq!(cut("E1 o 0 table(x) 1").len(), 8);
        assert_eq!(cut("E1(o 0) (a 0) 2").len(), 10);
        assert_eq!(cut(".func my_f(x) {x}")[..3], [".func", "my_f", "("]);
        assert_eq!(cut(".func größe.2(x) {x}")[..3], [".func", "größe.2", "("]);
        assert_eq!(cut(".ic v(a)=1"), [".ic", "v", "(", "a", ")", "=", "1"]);
        assert_eq!(cut("D1 a(b 0 DX"), ["D1", "a", "(", "b", "0", "DX"]);
    }

    #[test]
    fn separators_and_comments() {
        assert_eq!(cut("E1 (a,b) c\r\n* x\n+ d 2 $ tail"), ["E1", "(", "a", "b", ")", "c", "d", "2"]);
        assert_eq!(cut("R1 a$b c 1 ; x"), ["R1", "a$b", "c", "1"]);
        assert_eq!(cut("R1\u{A0}a µb\u{A0}100µ"), ["R1", "a", "µb", "100µ"]);
    }

    #[test]
    fn expressions_are_one_token() {
        assert_eq!(
            cut("R1 a b {2*{x} + 1} m='y z' \"f g\""),
            ["R1", "a", "b", "{2*{x} + 1}", "m", "=", "'y z'", "\"f g\""]
        );
    }

    #[test]
    fn an_open_brace_is_reported_where_it_stands() {
        let text = "R1 a b {1";
        assert_eq!(tokens(text, 0, 9, &mut Vec::new()).unwrap_err().start, 7);
    }
}
