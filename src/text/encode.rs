//! From decoded text back to the bytes it came from: where a place of the text stands in the file, and how words to put
//! there are encoded. The counterpart of `decode`.

use super::decode::Encoding;

/// Byte offsets in the file of `places` in its decoded text. The places ascend and stand on character boundaries;
/// what lies past the end is the end.
pub fn original_offsets(bytes: &[u8], encoding: Encoding, places: &[usize]) -> Vec<usize> {
    let mut walk = lengths(bytes, encoding);
    let (mut decoded, mut original) = (0, mark_length(bytes, encoding));
    // what is left of a long stretch that is alike in both and was entered in the middle
    let mut alike = 0;
    let offset = |&place: &usize| {
        while decoded < place {
            if alike == 0 {
                match walk.next() {
                    Some((in_text, in_file)) if in_text == in_file => alike = in_text,
                    Some((in_text, in_file)) => {
                        decoded += in_text;
                        original += in_file;
                        continue;
                    }
                    None => break,
                }
            }
            let step = alike.min(place - decoded);
            decoded += step;
            original += step;
            alike -= step;
        }
        original
    };
    places.iter().map(offset).collect()
}

/// Text as the file would hold it. Files that are no proper UTF-8 get UTF-8: every reader of such files must take both.
pub fn encode(text: &str, encoding: Encoding) -> Vec<u8> {
    match encoding {
        Encoding::Utf16Le => text.encode_utf16().flat_map(u16::to_le_bytes).collect(),
        Encoding::Utf16Be => text.encode_utf16().flat_map(u16::to_be_bytes).collect(),
        Encoding::Utf8 | Encoding::Utf8Bom | Encoding::Latin1 => text.as_bytes().to_vec(),
    }
}

/// Bytes of the byte order mark.
fn mark_length(bytes: &[u8], encoding: Encoding) -> usize {
    match encoding {
        Encoding::Utf16Le | Encoding::Utf16Be => 2,
        _ if bytes.starts_with(&[0xEF, 0xBB, 0xBF]) => 3,
        _ => 0,
    }
}

type Walk<'b> = Box<dyn Iterator<Item = (usize, usize)> + 'b>;

/// Stretches of the file behind its byte order mark: their length in the text and in the file.
fn lengths(bytes: &[u8], encoding: Encoding) -> Walk<'_> {
    let body = bytes.get(mark_length(bytes, encoding)..).unwrap_or_default();
    match encoding {
        Encoding::Utf8 | Encoding::Utf8Bom => Box::new(std::iter::once((body.len(), body.len()))),
        Encoding::Latin1 => Box::new(body.utf8_chunks().flat_map(|chunk| {
            let valid = chunk.valid().len();
            let stray = chunk.invalid().iter().map(|&byte| (char::from(byte).len_utf8(), 1));
            std::iter::once((valid, valid)).chain(stray)
        })),
        Encoding::Utf16Le => sixteen(body, u16::from_le_bytes),
        Encoding::Utf16Be => sixteen(body, u16::from_be_bytes),
    }
}

fn sixteen(body: &[u8], unit: fn([u8; 2]) -> u16) -> Walk<'_> {
    let (pairs, odd) = body.as_chunks::<2>();
    let characters = char::decode_utf16(pairs.iter().map(move |&pair| unit(pair))).map(|c| match c {
        Ok(c) => (c.len_utf8(), 2 * c.len_utf16()),
        Err(_) => (char::REPLACEMENT_CHARACTER.len_utf8(), 2),
    });
    let rest = (!odd.is_empty()).then_some((char::REPLACEMENT_CHARACTER.len_utf8(), 1));
    Box::new(characters.chain(rest))
}

#[cfg(test)]
mod tests {
    use super::super::decode::decode;
    use super::*;

    /// Every place of the text, and the text from there on decoded again.
    fn check(bytes: &[u8]) {
        let (text, encoding) = decode(bytes);
        let places: Vec<usize> = text.char_indices().map(|(at, _)| at).chain([text.len()]).collect();
        let offsets = original_offsets(bytes, encoding, &places);
        assert_eq!(offsets.last(), Some(&bytes.len()), "{bytes:?}");
        for (n, pair) in offsets.windows(2).enumerate() {
            let piece = &bytes[pair[0]..pair[1]];
            let wide = matches!(encoding, Encoding::Utf16Le | Encoding::Utf16Be);
            let order: &[u8] = match encoding {
                Encoding::Utf16Le => &[0xFF, 0xFE],
                Encoding::Utf16Be => &[0xFE, 0xFF],
                _ => b"",
            };
            let again = decode([order, piece].concat()).0;
            let is = &text[places[n]..places[n + 1]];
            // a carriage return by itself decodes to a line feed
            let same = again.replace('\r', "\n") == is.replace('\r', "\n");
            assert!(same || (wide && is == "\u{FFFD}"), "{bytes:?} at {n}: {again:?} {is:?}");
        }
    }

    #[test]
    fn every_character_is_found_again_in_every_encoding() {
        let text = "R1 µ 0 1k\r\nD1 a\u{1F600}b 0 DX\n";
        check(text.as_bytes());
        check(&[&[0xEF, 0xBB, 0xBF], text.as_bytes()].concat());
        check(&[&[0xEF, 0xBB, 0xBF], text.as_bytes(), b"\xB5\xE9 \xB5"].concat());
        check(b"R1 \xB5 0 1k\r\n\xE9\xE9 \xC2");
        check(text.replace("\r\n", "\r").replace('\n', "\r").as_bytes());
        for (order, bytes) in [
            ([0xFF, 0xFE], text.encode_utf16().flat_map(u16::to_le_bytes).collect::<Vec<u8>>()),
            ([0xFE, 0xFF], text.encode_utf16().flat_map(u16::to_be_bytes).collect()),
        ] {
            check(&[&order[..], &bytes].concat());
            check(&[&order[..], &bytes, &[0x00, 0xD8, 0x41, 0x00], &[0x41]].concat());
        }
        check(b"");
    }

    #[test]
    fn a_million_places_are_found() {
        let bytes = vec![b'a'; 1_000_000];
        let places: Vec<usize> = (0..=bytes.len()).collect();
        assert_eq!(original_offsets(&bytes, Encoding::Utf8, &places), places);
        let stray = [&bytes[..], b"\xB5", &bytes].concat();
        let (text, encoding) = decode(&stray[..]);
        let places: Vec<usize> = text.char_indices().map(|(at, _)| at).collect();
        assert!(original_offsets(&stray, encoding, &places).into_iter().eq(0..stray.len()));
    }

    #[test]
    fn what_is_encoded_decodes_to_itself() {
        let text = " ;@ blocking at Vµ=9";
        for (encoding, order) in [
            (Encoding::Utf16Le, &[0xFF, 0xFE][..]),
            (Encoding::Utf16Be, &[0xFE, 0xFF]),
            (Encoding::Utf8, b""),
        ] {
            assert_eq!(decode([order, &encode(text, encoding)].concat()).0, text);
        }
        assert_eq!(decode([b"\xE9", &encode(text, Encoding::Latin1)[..]].concat()).0, format!("é{text}"));
    }
}
