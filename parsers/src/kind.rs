//! What an export is by its bytes. Its name does not decide, but a name that promises a workbook is
//! held against what was found when nothing could be read.

use crate::names::shorten_to;
use crate::parsed::Refused;
use crate::rule::Bounds;

/// Bytes that are looked at to tell text from other bytes.
const LOOKED_AT: usize = 1 << 16;
/// From one control byte among so many on, bytes are no text: in random ones one in nine is.
const TEXT_PER_CONTROL: usize = 50;
const WORKBOOKS: [&str; 5] = [".xlsx", ".xlsm", ".xlsb", ".xls", ".ods"];

/// The container of an export.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    /// A zip archive, as xlsx, xlsb and ods are.
    Zip,
    /// A compound file, as xls and password-protected workbooks are.
    Compound,
    /// Anything else: text, if it can be decoded.
    Text,
}

impl Kind {
    pub(crate) fn of(bytes: &[u8], bounds: &Bounds) -> Result<Self, Refused> {
        if bytes.is_empty() {
            return Err(Refused::unfinished("the file is empty"));
        }
        if bytes.len() as u64 > bounds.file_bytes {
            return Err(Refused::new(format!(
                "the file has {} bytes; the limit is {}",
                bytes.len(),
                bounds.file_bytes
            )));
        }
        Ok(Self::by_signature(bytes))
    }

    pub(crate) fn by_signature(bytes: &[u8]) -> Self {
        if bytes.starts_with(b"PK\x03\x04") || bytes.starts_with(b"PK\x05\x06") {
            Self::Zip
        } else if bytes.starts_with(&[0xD0, 0xCF, 0x11, 0xE0]) {
            Self::Compound
        } else {
            Self::Text
        }
    }
}

/// True for bytes that are text in no encoding: strewn with control bytes, and not every second one
/// NUL as in UTF-16. NULs at the end do not count: a file that is still being written ends so.
pub(crate) fn is_binary(bytes: &[u8]) -> bool {
    let length = bytes.iter().rposition(|&b| b != 0).map_or(0, |at| at + 1);
    let bytes = &bytes[..length.min(LOOKED_AT)];
    let is_control = |b: u8| (b < b' ' && !matches!(b, b'\t'..=b'\r' | 0x1a)) || b == 0x7f;
    let controls = |from: usize| {
        let every_second = bytes.iter().skip(from).step_by(2);
        every_second.filter(|b| is_control(**b)).count()
    };
    let (even, odd) = (controls(0), controls(1));
    let is_utf_16 = (even == 0 || odd == 0) && bytes.contains(&0);
    even + odd > 1 && (even + odd) * TEXT_PER_CONTROL > bytes.len() && !is_utf_16
}

/// The refusal of bytes that are neither.
pub(crate) fn neither(bytes: &[u8]) -> Refused {
    let readable = bytes.iter().take_while(|b| b.is_ascii_graphic()).count();
    let begins = match readable {
        4.. => format!("`{}`", String::from_utf8_lossy(&bytes[..readable.min(16)])),
        _ => {
            let first = bytes.iter().take(4).map(|b| format!("{b:02X}"));
            format!("the bytes {}", first.collect::<Vec<_>>().join(" "))
        }
    };
    Refused {
        sentence: format!("the file is neither text nor a workbook; it begins with {begins}"),
        hint: Some(
            "export it again; if the instrument writes such files beside its exports, leave them out of `files`"
                .to_owned(),
        ),
        perhaps_unfinished: bytes.ends_with(&[0, 0]),
    }
}

/// A refusal of text, told with what the file is when its name promises a workbook.
pub(crate) fn misnamed(path: &str, text: &str, refused: Refused) -> Refused {
    let name = path.rsplit('/').next().unwrap_or(path);
    let lower = name.to_lowercase();
    if !WORKBOOKS.iter().any(|ending| lower.ends_with(ending)) {
        return refused;
    }
    let begins = shorten_to(text, 40).to_lowercase();
    let is_html = begins.starts_with("<!doctype html") || begins.starts_with("<html");
    let what = match begins.starts_with("<?xml") {
        true => "XML",
        false if is_html => "HTML",
        false => "plain text",
    };
    let hint = refused.hint.filter(|_| !is_html);
    Refused {
        sentence: format!(
            "`{}` is named as a workbook but holds {what}: {}",
            shorten_to(name, 100),
            refused.sentence
        ),
        hint: hint.or_else(|| Some("have it saved as a workbook (xlsx)".to_owned())),
        perhaps_unfinished: refused.perhaps_unfinished,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_in_any_encoding_is_not_binary() {
        let utf_16: Vec<u8> = "part\tvalue\r\n"
            .encode_utf16()
            .flat_map(u16::to_le_bytes)
            .collect();
        for text in [
            b"part,value\r\nP1,1\x1a".as_slice(),
            b"a\xb5m",
            b"a\x07b",
            b"part,value\nP1,1\0\0\0\0\0\0",
            &[0; 100],
            &utf_16,
            &utf_16[1..],
        ] {
            assert!(!is_binary(text), "{text:?}");
        }
    }

    #[test]
    fn bytes_of_pictures_and_programs_are() {
        let all: Vec<u8> = (0..=255).collect();
        let odd: Vec<u8> = (0..2000_u32).map(|i| (i * i / 7 % 251) as u8).collect();
        for bytes in [
            all.as_slice(),
            &odd,
            b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR\0\0\x02\0",
            b"\x7fELF\x02\x01\x01\0\0\0",
        ] {
            assert!(is_binary(bytes), "{bytes:?}");
        }
    }
}
