//! What an export is by its first bytes; its name does not count.

use crate::parsed::Refused;
use crate::rule::Bounds;

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
