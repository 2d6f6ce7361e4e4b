//! Bytes in, text out: which encoding they are in, or a clear no.

use super::TableError;

/// How a file's text was encoded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Encoding {
    /// UTF-8, with or without a byte order mark.
    Utf8,
    /// UTF-16, either byte order, with or without a byte order mark.
    Utf16,
    /// Windows-1252: guessed, since any bytes could be it. Letters beyond English ones may be wrong.
    Windows1252,
}

impl Encoding {
    /// The encoding's usual name.
    pub fn name(self) -> &'static str {
        match self {
            Self::Utf8 => "UTF-8",
            Self::Utf16 => "UTF-16",
            Self::Windows1252 => "Windows-1252",
        }
    }
}

/// What the bytes 80 to 9F stand for, `None` where nothing does. Source: WHATWG Encoding Standard, index windows-1252
/// (which gives 81, 8D, 8F, 90 and 9D to control characters; in a note they mean another encoding).
#[rustfmt::skip]
const WINDOWS_1252: [Option<char>; 32] = [
    Some('€'), None, Some('‚'), Some('ƒ'), Some('„'), Some('…'), Some('†'), Some('‡'),
    Some('ˆ'), Some('‰'), Some('Š'), Some('‹'), Some('Œ'), None, Some('Ž'), None,
    None, Some('‘'), Some('’'), Some('“'), Some('”'), Some('•'), Some('–'), Some('—'),
    Some('˜'), Some('™'), Some('š'), Some('›'), Some('œ'), None, Some('ž'), Some('Ÿ'),
];

/// The text of a file, without a byte order mark.
///
/// A byte order mark decides. Without one: UTF-8 if the bytes are that, UTF-16 if every other byte is mostly zero, else
/// Windows-1252 if no byte speaks against it.
///
/// # Errors
/// [`TableError::NotText`] when it is none of these.
pub fn decode(bytes: &[u8]) -> Result<(String, Encoding), TableError> {
    if let Some(rest) = bytes.strip_prefix(b"\xef\xbb\xbf") {
        return utf8(rest);
    }
    if let Some(rest) = bytes.strip_prefix(b"\xff\xfe") {
        return utf16(rest, u16::from_le_bytes);
    }
    if let Some(rest) = bytes.strip_prefix(b"\xfe\xff") {
        return utf16(rest, u16::from_be_bytes);
    }
    if bytes.contains(&0) {
        // Of Latin letters the higher byte is zero.
        let zeros = |from: usize| bytes.iter().skip(from).step_by(2).filter(|&&byte| byte == 0).count();
        let (first, second, half) = (zeros(0), zeros(1), bytes.len() / 2);
        if bytes.len().is_multiple_of(2) && second > half / 2 && first < half / 10 {
            return utf16(bytes, u16::from_le_bytes);
        }
        if bytes.len().is_multiple_of(2) && first > half / 2 && second < half / 10 {
            return utf16(bytes, u16::from_be_bytes);
        }
        let at = bytes.iter().position(|&byte| byte == 0).unwrap_or(0);
        return Err(TableError::NotText(format!("its byte {at} is zero")));
    }
    match utf8(bytes) {
        Err(TableError::NotText(_)) => windows_1252(bytes),
        done => done,
    }
}

fn utf8(bytes: &[u8]) -> Result<(String, Encoding), TableError> {
    match std::str::from_utf8(bytes) {
        Ok(text) => Ok((text.to_owned(), Encoding::Utf8)),
        Err(error) => Err(TableError::NotText(format!("its byte {} fits no letter", error.valid_up_to()))),
    }
}

fn utf16(bytes: &[u8], unit: fn([u8; 2]) -> u16) -> Result<(String, Encoding), TableError> {
    let (pairs, rest) = bytes.as_chunks::<2>();
    if !rest.is_empty() {
        return Err(TableError::NotText("it is cut off within a letter".into()));
    }
    let text: Result<String, _> = char::decode_utf16(pairs.iter().map(|&pair| unit(pair))).collect();
    match text {
        Ok(text) => Ok((text, Encoding::Utf16)),
        Err(_) => Err(TableError::NotText("half a letter stands alone in it".into())),
    }
}

fn windows_1252(bytes: &[u8]) -> Result<(String, Encoding), TableError> {
    let mut text = String::with_capacity(bytes.len() + bytes.len() / 8);
    for (at, &byte) in bytes.iter().enumerate() {
        text.push(match byte {
            b'\t' | b'\n' | b'\r' | 0x0c | 0x20..=0x7e | 0xa0.. => char::from(byte),
            0x80..=0x9f => WINDOWS_1252[usize::from(byte - 0x80)]
                .ok_or_else(|| TableError::NotText(format!("its byte {at} is {byte:#04x}")))?,
            _ => return Err(TableError::NotText(format!("its byte {at} is the control code {byte:#04x}"))),
        });
    }
    Ok((text, Encoding::Windows1252))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn utf16_bytes(text: &str, order: fn(u16) -> [u8; 2]) -> Vec<u8> {
        text.encode_utf16().flat_map(order).collect()
    }

    #[test]
    fn the_encodings_of_the_trade_are_told_apart() {
        let text = "Müller’s zip — 5 €";
        let marked = |mark: &[u8], rest: Vec<u8>| [mark, &rest].concat();
        for (bytes, encoding) in [
            (text.as_bytes().to_vec(), Encoding::Utf8),
            (marked(b"\xef\xbb\xbf", text.as_bytes().to_vec()), Encoding::Utf8),
            (marked(b"\xff\xfe", utf16_bytes(text, u16::to_le_bytes)), Encoding::Utf16),
            (marked(b"\xfe\xff", utf16_bytes(text, u16::to_be_bytes)), Encoding::Utf16),
            (utf16_bytes(text, u16::to_le_bytes), Encoding::Utf16),
            (utf16_bytes(text, u16::to_be_bytes), Encoding::Utf16),
            (b"M\xfcller\x92s zip \x97 5 \x80".to_vec(), Encoding::Windows1252),
        ] {
            assert_eq!(decode(&bytes), Ok((text.to_owned(), encoding)), "{bytes:02x?}");
        }
    }

    #[test]
    fn what_is_no_text_is_refused() {
        for bytes in [
            b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR".as_slice(),
            b"\xff\xfea\0b",          // cut off
            b"\xff\xfe\x00\xd8a\0",   // half a pair
            b"\xef\xbb\xbfM\xfcller", // says UTF-8 and is not
            b"M\xfcller \x81",
            b"M\xfcller \x1b[31m",
            b"%PDF-1.7\n\x01\xe2\xe3",
        ] {
            assert_eq!(decode(bytes).unwrap_err().code(), "not-text", "{bytes:02x?}");
        }
    }
}
