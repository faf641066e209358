//! White space inside one statement: blanks, line ends with their `+`, comment lines between, trailing comments.

use nom::IResult;

/// Bytes that separate words: all control characters and the space.
pub(super) fn is_blank(byte: u8) -> bool {
    byte <= b' '
}

/// `blank = *( WSP / continuation / comment )`: everything between two words of one statement.
///
/// The statement was cut out by [`super::lines()`], so that a line end inside it is always followed by comment
/// lines, empty lines or a continuation.
pub(super) fn blank(input: &[u8]) -> IResult<&[u8], (), ()> {
    let mut at = 0;
    loop {
        match input.get(at) {
            Some(b'\n') => at = continuation(input, at),
            Some(&byte) if is_blank(byte) => at += 1,
            Some(b';') => at = line_end(input, at),
            Some(b'$') if at > 0 && input.get(at - 1).is_some_and(|&b| is_blank(b)) => {
                at = line_end(input, at)
            }
            Some(0xC2) if is_hard_space(input, at) => at += 2,
            _ => break,
        }
    }
    Ok((input.get(at..).unwrap_or_default(), ()))
}

/// Whether U+00A0, the space that does not break, stands at `at`: copied from a document, it is a blank like others.
pub(super) fn is_hard_space(input: &[u8], at: usize) -> bool {
    input.get(at..at + 2) == Some(&[0xC2, 0xA0])
}

/// From a line end over comment lines to behind the `+` of the next continuation.
fn continuation(input: &[u8], at: usize) -> usize {
    let mut at = at + 1;
    while input.get(at).is_some_and(|&b| b != b'\n' && is_blank(b)) {
        at += 1;
    }
    match input.get(at) {
        Some(b'+') => at + 1,
        Some(b'*') => line_end(input, at),
        _ => at,
    }
}

fn line_end(input: &[u8], at: usize) -> usize {
    let rest = input.get(at..).unwrap_or_default();
    at + memchr::memchr(b'\n', rest).unwrap_or(rest.len())
}
