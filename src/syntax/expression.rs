//! Expressions: `{2*rload + 1k}`. Text to a tree, with depth and size bounded; evaluation is `circuit`'s.

use super::blank::blank;
use super::number::number;
use nom::bytes::complete::take_while1;
use nom::{IResult, Parser};
use std::ops::Range;

/// Operators of two sides, by rising precedence.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Binary {
    /// `||`
    Or,
    /// `&&`
    And,
    /// `==`
    Equal,
    /// `!=`
    Unequal,
    /// `<`
    Less,
    /// `<=`
    LessOrEqual,
    /// `>`
    Greater,
    /// `>=`
    GreaterOrEqual,
    /// `+`
    Add,
    /// `-`
    Subtract,
    /// `*`
    Multiply,
    /// `/`
    Divide,
    /// `%`
    Remainder,
    /// `**` or `^`
    Power,
}

/// An expression. Ranges count bytes of the text that was read.
#[derive(Debug, Clone, PartialEq)]
pub enum Expression {
    /// A number, its scale applied, and where it stands.
    Number(f64, Range<usize>),
    /// A parameter.
    Name(Range<usize>),
    /// A function: its name, its arguments.
    Call(Range<usize>, Vec<Expression>),
    /// `-x`
    Negative(Box<Expression>),
    /// `!x`
    Not(Box<Expression>),
    /// Two sides; the range is the operator's.
    Two(Binary, Range<usize>, Box<Expression>, Box<Expression>),
    /// `c ? x : y`
    Choice(Box<Expression>, Box<Expression>, Box<Expression>),
}

/// Where and why an expression could not be read.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ExpressionProblem {
    /// Byte of the text.
    pub at: usize,
    /// In a few words.
    pub what: &'static str,
    /// It is too deep or too long, not wrong.
    pub is_limit: bool,
}

/// Brackets within brackets.
const MOST_NESTED: usize = 64;
/// Operators, names and numbers together.
const MOST_PARTS: usize = 2000;

/// `expression = choice`
///
/// # Errors
/// [`ExpressionProblem`] says where it stops making sense, or that it passes the limits.
pub fn expression(text: &str) -> Result<Expression, ExpressionProblem> {
    let mut reader = Reader { text: text.as_bytes(), at: 0, depth: 0, parts: 0 };
    let tree = reader.choice()?;
    reader.skip();
    if reader.at < text.len() {
        return Err(reader.problem("an operator was expected here"));
    }
    Ok(tree)
}

struct Reader<'t> {
    text: &'t [u8],
    at: usize,
    depth: usize,
    parts: usize,
}

type Tree = Result<Expression, ExpressionProblem>;

impl Reader<'_> {
    fn rest(&self) -> &[u8] {
        self.text.get(self.at..).unwrap_or_default()
    }

    fn problem(&self, what: &'static str) -> ExpressionProblem {
        ExpressionProblem { at: self.at.min(self.text.len()), what, is_limit: false }
    }

    fn skip(&mut self) {
        // `;` cannot stand inside an expression, so that the blanks of statements are those of expressions
        if let Ok((rest, ())) = blank(self.rest()) {
            self.at = self.text.len() - rest.len();
        }
    }

    fn take(&mut self, sign: &[u8]) -> bool {
        self.skip();
        let found = self.rest().starts_with(sign);
        if found {
            self.at += sign.len();
        }
        found
    }

    /// Counts a part and a level; the caller leaves the level with `self.depth -= 1`.
    fn enter(&mut self) -> Result<(), ExpressionProblem> {
        self.depth += 1;
        self.part()?;
        if self.depth > MOST_NESTED {
            return Err(ExpressionProblem {
                at: self.at,
                what: "too many brackets within brackets",
                is_limit: true,
            });
        }
        Ok(())
    }

    fn part(&mut self) -> Result<(), ExpressionProblem> {
        self.parts += 1;
        if self.parts > MOST_PARTS {
            return Err(ExpressionProblem {
                at: self.at,
                what: "an expression of too many parts",
                is_limit: true,
            });
        }
        Ok(())
    }

    /// `choice = binary [ "?" choice ":" choice ]`
    fn choice(&mut self) -> Tree {
        self.enter()?;
        let condition = self.binary(0)?;
        let tree = if self.take(b"?") {
            let yes = self.choice()?;
            if !self.take(b":") {
                return Err(self.problem("a : was expected here, to go with the ? before it"));
            }
            Expression::Choice(Box::new(condition), Box::new(yes), Box::new(self.choice()?))
        } else {
            condition
        };
        self.depth -= 1;
        Ok(tree)
    }

    /// `binary = unary *( operator unary )`, by precedence; all from the left but powers
    fn binary(&mut self, least: u8) -> Tree {
        let mut left = self.unary()?;
        loop {
            self.skip();
            let Some((operator, length, strength)) = operator(self.rest()).filter(|o| o.2 >= least) else {
                return Ok(left);
            };
            let place = self.at..self.at + length;
            self.at += length;
            self.enter()?;
            let right = self.binary(if operator == Binary::Power { strength } else { strength + 1 })?;
            self.depth -= 1;
            left = Expression::Two(operator, place, Box::new(left), Box::new(right));
        }
    }

    /// `unary = *( "-" / "+" / "!" ) primary`; a sign binds less than a power: -2**2 is -4
    fn unary(&mut self) -> Tree {
        self.skip();
        let sign = self.rest().first().copied();
        if !matches!(sign, Some(b'-' | b'+' | b'!' | b'~')) {
            return self.primary();
        }
        self.at += 1;
        self.enter()?;
        let inner = self.binary(POWER)?;
        self.depth -= 1;
        Ok(match sign {
            Some(b'-') => Expression::Negative(Box::new(inner)),
            Some(b'+') => inner,
            _ => Expression::Not(Box::new(inner)),
        })
    }

    /// `primary = number / name / call / "(" choice ")" / braced`
    fn primary(&mut self) -> Tree {
        self.part()?;
        self.skip();
        match self.rest().first() {
            Some(b'(') => self.bracketed(b")", "a ) was expected here"),
            Some(b'{') => self.bracketed(b"}", "a } was expected here"),
            Some(b'0'..=b'9' | b'.') => self.number(),
            Some(&byte) if is_name_start(byte) => self.name(),
            Some(_) => Err(self.problem("a number, a name or a bracket was expected here")),
            None => Err(self.problem("the expression ends too early")),
        }
    }

    fn bracketed(&mut self, close: &[u8], missing: &'static str) -> Tree {
        self.at += 1;
        let inner = self.choice()?;
        if self.take(close) { Ok(inner) } else { Err(self.problem(missing)) }
    }

    fn number(&mut self) -> Tree {
        let start = self.at;
        let length = number_run(self.rest());
        self.at += length;
        match number(self.text.get(start..self.at).unwrap_or_default()) {
            Some(number) => Ok(Expression::Number(number.value, start..self.at)),
            None => {
                self.at = start;
                Err(self.problem("this is no number"))
            }
        }
    }

    /// `call = name "(" [ choice *( "," choice ) ] ")"`
    fn name(&mut self) -> Tree {
        let start = self.at;
        let length = name_run(self.rest()).map_or(1, |(_, run)| run.len());
        self.at += length;
        let name = start..self.at;
        if !self.take(b"(") {
            return Ok(Expression::Name(name));
        }
        let mut arguments = Vec::new();
        if self.take(b")") {
            return Ok(Expression::Call(name, arguments));
        }
        loop {
            arguments.push(self.choice()?);
            if self.take(b")") {
                return Ok(Expression::Call(name, arguments));
            }
            if !self.take(b",") {
                return Err(self.problem("a , or a ) was expected here"));
            }
        }
    }
}

const POWER: u8 = 6;

/// Operator, its length, its strength.
fn operator(text: &[u8]) -> Option<(Binary, usize, u8)> {
    Some(match text {
        [b'|', b'|', ..] => (Binary::Or, 2, 0),
        [b'|', ..] => (Binary::Or, 1, 0),
        [b'&', b'&', ..] => (Binary::And, 2, 1),
        [b'&', ..] => (Binary::And, 1, 1),
        [b'=', b'=', ..] => (Binary::Equal, 2, 2),
        [b'!', b'=', ..] => (Binary::Unequal, 2, 2),
        [b'<', b'=', ..] => (Binary::LessOrEqual, 2, 3),
        [b'<', ..] => (Binary::Less, 1, 3),
        [b'>', b'=', ..] => (Binary::GreaterOrEqual, 2, 3),
        [b'>', ..] => (Binary::Greater, 1, 3),
        [b'+', ..] => (Binary::Add, 1, 4),
        [b'-', ..] => (Binary::Subtract, 1, 4),
        [b'*', b'*', ..] => (Binary::Power, 2, POWER),
        [b'^', ..] => (Binary::Power, 1, POWER),
        [b'*', ..] => (Binary::Multiply, 1, 5),
        [b'/', ..] => (Binary::Divide, 1, 5),
        [b'%', ..] => (Binary::Remainder, 1, 5),
        _ => return None,
    })
}

fn is_name_start(byte: u8) -> bool {
    byte.is_ascii_alphabetic() || matches!(byte, b'_' | b'$' | b'@' | b'#') || byte >= 0x80
}

/// `name = name-start *( name-start / DIGIT / "." )`
fn name_run(text: &[u8]) -> IResult<&[u8], &[u8], ()> {
    take_while1(is_in_names).parse(text)
}

/// Whether a parameter's or function's name may hold this byte.
pub(super) fn is_in_names(byte: u8) -> bool {
    is_name_start(byte) || byte.is_ascii_digit() || byte == b'.'
}

/// Length of a number with its exponent, suffix and unit letters.
fn number_run(text: &[u8]) -> usize {
    let mut at = 0;
    while let Some(&byte) = text.get(at) {
        let exponent_sign = matches!(byte, b'+' | b'-')
            && at > 0
            && matches!(text.get(at - 1), Some(b'e' | b'E'))
            && text.get(at + 1).is_some_and(u8::is_ascii_digit)
            && text[..at - 1].iter().all(|b| b.is_ascii_digit() || *b == b'.');
        if !(byte.is_ascii_alphanumeric() || byte == b'.' || byte >= 0x80 || exponent_sign) {
            break;
        }
        at += 1;
    }
    at
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn precedence_and_association() {
        let shown = format!("{:?}", expression("1+2*3").unwrap());
        assert!(shown.starts_with("Two(Add"), "{shown}");
        let shown = format!("{:?}", expression("(1+2)*3").unwrap());
        assert!(shown.starts_with("Two(Multiply"), "{shown}");
        let shown = format!("{:?}", expression("-2**2").unwrap());
        assert!(shown.starts_with("Negative(Two(Power"), "{shown}");
    }

    #[test]
    fn what_is_broken_is_told_with_its_place() {
        assert_eq!(expression("1+").unwrap_err().at, 2);
        assert_eq!(expression("(1").unwrap_err().what, "a ) was expected here");
        assert_eq!(expression("1 2").unwrap_err().at, 2);
        assert!(expression("").is_err());
    }

    #[test]
    fn depth_and_size_are_bounded() {
        assert!(expression(&"(".repeat(100_000)).unwrap_err().is_limit);
        assert!(expression(&"-".repeat(100_000)).unwrap_err().is_limit);
        assert!(expression(&"1+".repeat(100_000)).unwrap_err().is_limit);
        assert!(expression(&"2^".repeat(100_000)).unwrap_err().is_limit);
    }

    #[test]
    fn continuation_signs_are_blanks() {
        assert!(expression("1 +\n+ 2").is_ok());
    }
}
