//! Bytes to text: byte-order mark, then strict UTF-8, then the encoding that the rule names. Nothing
//! is guessed, and damage is an error, never a replacement character.
//!
//! Invariant: decoded text holds no control characters but tab, line ends (U+0085 too) and form feed.

use std::borrow::Cow;

use encoding_rs::{DecoderResult, Encoding, UTF_8, UTF_16BE, UTF_16LE};

use crate::kind::{is_binary, neither};
use crate::parsed::Refused;

/// The end-of-file mark that old exporters append.
const CONTROL_Z: char = '\u{1a}';
/// Bytes of text that are decoded at once in search of damage.
const STEP: usize = 4096;
/// Bytes in which an XML declaration must end.
const DECLARATION_MAX: usize = 1024;

/// Decodes a whole export.
///
/// `declared` is what the text says of itself (XML), `named` what the rule says.
pub(crate) fn decode<'a>(
    bytes: &'a [u8],
    declared: Option<&'static Encoding>,
    named: Option<&'static Encoding>,
) -> Result<Cow<'a, str>, Refused> {
    let marked = Encoding::for_bom(bytes);
    if marked.is_none() && is_binary(bytes) {
        return Err(neither(bytes));
    }
    let by = match declared {
        Some(_) => "as its first line says",
        None => "as the rule says",
    };
    let text = match marked {
        Some((encoding, mark)) => with(encoding, &bytes[mark..], "as its first bytes say")?,
        None => match declared.or(named.filter(|encoding| !encoding.is_ascii_compatible())) {
            Some(encoding) => with(encoding, bytes, by)?,
            None => match (std::str::from_utf8(bytes), named) {
                (Ok(text), _) => Cow::Borrowed(text),
                (Err(_), Some(encoding)) if encoding != UTF_8 => with(encoding, bytes, by)?,
                (Err(why), _) => {
                    return Err(not_utf8(bytes, why, "and nothing names another encoding"));
                }
            },
        },
    };
    checked(text)
}

/// The encoding that an XML declaration names, or that the first bytes of one betray.
pub(crate) fn declared(bytes: &[u8]) -> Option<&'static Encoding> {
    match bytes {
        [b'<', 0, b'?', 0, ..] => return Some(UTF_16LE),
        [0, b'<', 0, b'?', ..] => return Some(UTF_16BE),
        _ => {}
    }
    let head = &bytes[..bytes.len().min(DECLARATION_MAX)];
    let head = head.strip_prefix(b"<?xml")?;
    let declaration = &head[..head.iter().position(|&b| b == b'>')?];
    let declaration = std::str::from_utf8(declaration).ok()?;
    let (_, rest) = declaration.split_once("encoding")?;
    let rest = rest.trim_start().strip_prefix('=')?.trim_start();
    let quote = rest.chars().next().filter(|c| matches!(c, '"' | '\''))?;
    let label = rest[1..].split(quote).next()?;
    let encoding = Encoding::for_label_no_replacement(label.as_bytes())?;
    // The declaration was read byte by byte: it cannot be in an encoding of two bytes a character.
    (encoding.is_ascii_compatible() && encoding != UTF_8).then_some(encoding)
}

/// `by`: who says that the text is in that encoding.
fn with<'a>(
    encoding: &'static Encoding,
    bytes: &'a [u8],
    by: &str,
) -> Result<Cow<'a, str>, Refused> {
    if encoding == UTF_8 {
        return std::str::from_utf8(bytes)
            .map(Cow::Borrowed)
            .map_err(|why| not_utf8(bytes, why, by));
    }
    encoding
        .decode_without_bom_handling_and_without_replacement(bytes)
        .ok_or_else(|| not_in(encoding, bytes, by))
}

/// Finds the damage: only then is the text decoded step by step.
fn not_in(encoding: &'static Encoding, bytes: &[u8], by: &str) -> Refused {
    let mut decoder = encoding.new_decoder_without_bom_handling();
    let (mut line, mut rest) = (1, bytes);
    let mut step = String::with_capacity(STEP);
    let (malformed, behind) = loop {
        let (result, read) = decoder.decode_to_string_without_replacement(rest, &mut step, true);
        line += step.matches('\n').count();
        rest = rest.get(read..).unwrap_or_default();
        match result {
            DecoderResult::OutputFull if read > 0 || !step.is_empty() => step.clear(),
            DecoderResult::Malformed(length, behind) => {
                break (usize::from(length), usize::from(behind));
            }
            DecoderResult::OutputFull | DecoderResult::InputEmpty => break (0, 0),
        }
    };
    let end = bytes.len() - rest.len() - behind.min(bytes.len() - rest.len());
    let wrong = &bytes[end.saturating_sub(malformed)..end];
    let shown: Vec<String> = wrong.iter().map(|byte| format!("{byte:02X}")).collect();
    let is_cut = rest.is_empty() && behind == 0 && !encoding.is_single_byte();
    Refused {
        sentence: match (is_cut, shown.as_slice()) {
            (true, _) => format!(
                "line {line}: the file ends inside a character of the encoding {}, {by}",
                encoding.name()
            ),
            (false, [one]) => format!(
                "line {line}: the byte 0x{one} means nothing in the encoding {}, {by}",
                encoding.name()
            ),
            (false, several) => format!(
                "line {line}: the bytes {} mean nothing in the encoding {}, {by}",
                several.join(" "),
                encoding.name()
            ),
        },
        hint: Some("correct `encoding`: it is what the instrument writes its text in".to_owned()),
        perhaps_unfinished: is_cut,
    }
}

fn not_utf8(bytes: &[u8], why: std::str::Utf8Error, by: &str) -> Refused {
    if nul_tail(bytes) {
        return nuls();
    }
    let (text, rest) = bytes.split_at(why.valid_up_to());
    let line = 1 + text.iter().filter(|&&byte| byte == b'\n').count();
    Refused {
        sentence: format!(
            "line {line}: the byte 0x{:02X} is not UTF-8 text, {by}",
            rest.first().copied().unwrap_or(0)
        ),
        hint: Some(
            "if this is text, name its encoding, as in `encoding = \"windows-1252\"`".to_owned(),
        ),
        perhaps_unfinished: why.error_len().is_none(),
    }
}

fn nul_tail(bytes: &[u8]) -> bool {
    bytes.ends_with(&[0, 0]) || bytes == [0]
}

fn nuls() -> Refused {
    Refused {
        sentence: "the file ends in NUL bytes, as one does that is still being written".to_owned(),
        hint: None,
        perhaps_unfinished: true,
    }
}

fn checked(text: Cow<'_, str>) -> Result<Cow<'_, str>, Refused> {
    if text.trim().is_empty() {
        return Err(Refused::unfinished("the file holds nothing but blanks"));
    }
    let kept = text.trim_end_matches(CONTROL_Z).len();
    let odd = text[..kept]
        .char_indices()
        .find(|(_, c)| c.is_control() && !matches!(c, '\t' | '\n' | '\r' | '\u{c}' | '\u{85}'));
    match odd {
        Some((_, '\0')) if text.ends_with('\0') => Err(nuls()),
        Some((at, found)) => Err(Refused {
            sentence: format!(
                "line {}: the control character U+{:04X} does not belong in text",
                1 + text[..at].matches('\n').count(),
                u32::from(found)
            ),
            hint: Some(match found {
                '\0' => "if this is UTF-16 without a byte-order mark, set `encoding = \"utf-16le\"`",
                '\u{80}'..='\u{9f}' => "is `encoding` what the instrument writes its text in?",
                _ => "have it exported again; text holds no control characters but tabs and line ends",
            }.to_owned()),
            perhaps_unfinished: false,
        }),
        None => Ok(match text {
            Cow::Borrowed(text) => Cow::Borrowed(&text[..kept]),
            Cow::Owned(mut text) => {
                text.truncate(kept);
                Cow::Owned(text)
            }
        }),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use encoding_rs::WINDOWS_1252;

    fn refused(bytes: &[u8]) -> (String, bool) {
        let refused = decode(bytes, None, None).unwrap_err();
        (refused.sentence, refused.perhaps_unfinished)
    }

    #[test]
    fn marks_and_names_decide() {
        assert_eq!(decode(b"\xef\xbb\xbf\xc2\xb5m", None, None).unwrap(), "µm");
        assert_eq!(decode(b"\xff\xfe\xb5\0m\0", None, None).unwrap(), "µm");
        assert_eq!(decode(b"\xfe\xff\0\xb5\0m", None, None).unwrap(), "µm");
        assert_eq!(decode(b"\xb5m", None, Some(WINDOWS_1252)).unwrap(), "µm");
        assert_eq!(
            decode("µm".as_bytes(), None, Some(WINDOWS_1252)).unwrap(),
            "µm"
        );
        assert_eq!(decode(b"\xb5\0m\0", None, Some(UTF_16LE)).unwrap(), "µm");
        assert_eq!(decode(b"part\r\n\x1a", None, None).unwrap(), "part\r\n");
    }

    #[test]
    fn damage_is_refused_and_a_cut_file_is_told_apart() {
        assert!(
            refused(b"a\xb5m")
                .0
                .starts_with("line 1: the byte 0xB5 is not UTF-8")
        );
        assert!(!refused(b"a\xb5m").1);
        assert!(refused(b"a\xc2").1);
        assert!(refused(b"\xff\xfea\0b").1);
        assert!(refused(b"part,value\n1,2\0\0\0\0").1);
        assert!(refused(b" \r\n ").1);
        assert!(!refused(b"p\0a\0r\0t").1);
        assert!(
            refused(b"a\nb\x01c")
                .0
                .starts_with("line 2: the control character U+0001")
        );
    }

    #[test]
    fn damage_in_a_named_encoding_has_its_line() {
        use encoding_rs::{BIG5, GBK, ISO_8859_7, SHIFT_JIS};
        let told = |encoding, bytes: &[u8]| decode(bytes, None, Some(encoding)).unwrap_err();
        let lines = [b"\xb5\n".repeat(5000).as_slice(), b"\xff"].concat();
        for (encoding, bytes, sentence) in [
            (
                SHIFT_JIS,
                b"a\nb\x81\x20c".as_slice(),
                "line 2: the byte 0x81 means nothing in the encoding Shift_JIS, as the rule says",
            ),
            (
                ISO_8859_7,
                &lines,
                "line 5001: the byte 0xFF means nothing in the encoding ISO-8859-7",
            ),
            (
                GBK,
                b"a\n\x81",
                "line 2: the file ends inside a character of the encoding GBK",
            ),
            (
                BIG5,
                b"\xa4\xa4\n\xff\xff",
                "line 2: the byte 0xFF means nothing in the encoding Big5",
            ),
            (
                WINDOWS_1252,
                b"\xb5\n\x81",
                "line 2: the control character U+0081",
            ),
        ] {
            let refused = told(encoding, bytes);
            assert!(
                refused.sentence.starts_with(sentence),
                "{}",
                refused.sentence
            );
            assert_eq!(refused.perhaps_unfinished, sentence.contains("ends inside"));
        }
        let marked = decode(b"\xef\xbb\xbfa\n\xb5", None, None).unwrap_err();
        assert_eq!(
            marked.sentence,
            "line 2: the byte 0xB5 is not UTF-8 text, as its first bytes say"
        );
    }

    #[test]
    fn an_xml_declaration_is_read_up_to_its_end() {
        let of = |bytes: &[u8]| declared(bytes).map(Encoding::name);
        assert_eq!(
            of(b"<?xml version='1.0' encoding='ISO-8859-1'?><a/>"),
            Some("windows-1252")
        );
        assert_eq!(of(b"<?xml version=\"1.0\" encoding=\"UTF-16\"?>"), None);
        assert_eq!(of(b"<?xml version=\"1.0\"?><a encoding=\"latin1\"/>"), None);
        assert_eq!(of(b"<\0?\0x\0m\0l\0"), Some("UTF-16LE"));
        assert_eq!(of(b"<?xml encoding"), None);
    }
}
