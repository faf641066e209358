//! Bytes to text: UTF-8 with or without BOM, UTF-16 with BOM, and stray Latin-1 bytes. Never fails.

/// How a file was encoded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Encoding {
    /// UTF-8 without byte order mark.
    Utf8,
    /// UTF-8 behind a byte order mark (which is not part of the text).
    Utf8Bom,
    /// UTF-16, little end first, behind a byte order mark.
    Utf16Le,
    /// UTF-16, big end first, behind a byte order mark.
    Utf16Be,
    /// Not UTF-8: bytes that are no UTF-8 were read as Latin-1 (ISO 8859-1).
    Latin1,
}

/// Decodes a whole file. Invalid UTF-16 units become U+FFFD.
/// Where carriage returns alone end the lines, they become line feeds.
pub fn decode(bytes: impl Into<Vec<u8>>) -> (String, Encoding) {
    let (text, encoding) = decoded(bytes.into());
    if memchr::memchr(b'\n', text.as_bytes()).is_none() && text.contains('\r') {
        return (text.replace('\r', "\n"), encoding);
    }
    (text, encoding)
}

fn decoded(bytes: Vec<u8>) -> (String, Encoding) {
    match bytes.as_slice() {
        [0xEF, 0xBB, 0xBF, rest @ ..] => {
            let (text, encoding) = utf8_or_latin1(rest.to_vec());
            (text, if encoding == Encoding::Utf8 { Encoding::Utf8Bom } else { encoding })
        }
        [0xFF, 0xFE, rest @ ..] => (utf16(rest, u16::from_le_bytes), Encoding::Utf16Le),
        [0xFE, 0xFF, rest @ ..] => (utf16(rest, u16::from_be_bytes), Encoding::Utf16Be),
        _ => utf8_or_latin1(bytes),
    }
}

fn utf8_or_latin1(bytes: Vec<u8>) -> (String, Encoding) {
    let bytes = match String::from_utf8(bytes) {
        Ok(text) => return (text, Encoding::Utf8),
        Err(problem) => problem.into_bytes(),
    };
    // only the stray bytes are Latin-1: the rest of such files is often proper UTF-8
    let mut text = String::with_capacity(bytes.len() + 16);
    for chunk in bytes.utf8_chunks() {
        text.push_str(chunk.valid());
        text.extend(chunk.invalid().iter().map(|&b| char::from(b)));
    }
    (text, Encoding::Latin1)
}

fn utf16(bytes: &[u8], unit: fn([u8; 2]) -> u16) -> String {
    let (pairs, odd) = bytes.as_chunks::<2>();
    let mut text: String = char::decode_utf16(pairs.iter().map(|&pair| unit(pair)))
        .map(|c| c.unwrap_or(char::REPLACEMENT_CHARACTER))
        .collect();
    if !odd.is_empty() {
        text.push(char::REPLACEMENT_CHARACTER);
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_encoding_reads_the_same() {
        let plain = "R1 µ 0 1k\r\n";
        let mut with_bom = vec![0xEF, 0xBB, 0xBF];
        with_bom.extend(plain.as_bytes());
        let mut little = vec![0xFF, 0xFE];
        little.extend(plain.encode_utf16().flat_map(u16::to_le_bytes));
        let mut big = vec![0xFE, 0xFF];
        big.extend(plain.encode_utf16().flat_map(u16::to_be_bytes));
        let latin: Vec<u8> = plain.chars().map(|c| u8::try_from(u32::from(c)).unwrap()).collect();
        for bytes in [plain.as_bytes().to_vec(), with_bom, little, big, latin] {
            assert_eq!(decode(bytes).0, plain);
        }
    }
}
