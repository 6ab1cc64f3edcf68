//! Records of a part of an xlsb workbook: a kind and a length, seven bits a byte, and data
//! ([MS-XLSB] 2.1.4).

use std::io::{self, BufReader, Cursor, Read};
use std::ops::ControlFlow;

use zip::ZipArchive;
use zip::read::ZipFile;

use crate::damage::{damaged, of_zip};
use crate::parsed::Refused;

pub(super) type Zip<'a> = ZipArchive<Cursor<&'a [u8]>>;

/// Data of one record beyond this is passed over: no cell holds so much.
const LOOKED_INTO: u64 = 1 << 20;
/// Records of a part: cells, and the rows they stand in.
const RECORDS_MAX: usize = 1 << 24;

/// Goes through a part's records until one breaks off; a part that is not there has none.
pub(super) fn each(
    zip: &mut Zip<'_>,
    name: &str,
    mut take: impl FnMut(u16, &[u8]) -> Result<ControlFlow<()>, Refused>,
) -> Result<(), Refused> {
    let Some(part) = part(zip, name)? else {
        return Ok(());
    };
    let mut part = BufReader::new(part);
    let mut data = Vec::new();
    for _ in 0..RECORDS_MAX {
        match record(&mut part, &mut data) {
            Ok(Some(kind)) => {
                if take(kind, &data)?.is_break() {
                    return Ok(());
                }
            }
            Ok(None) => return Ok(()),
            Err(_) => return Err(damaged("a part ends within a record")),
        }
    }
    Err(Refused::new(format!(
        "a part of the workbook has more than {RECORDS_MAX} records; that is the limit"
    )))
}

/// The part of that name in any case.
pub(super) fn part<'z, 'a>(
    zip: &'z mut Zip<'a>,
    name: &str,
) -> Result<Option<ZipFile<'z, Cursor<&'a [u8]>>>, Refused> {
    let same = |part: &str| part.replace('\\', "/").eq_ignore_ascii_case(name);
    let found = zip
        .file_names()
        .filter_map(Result::ok)
        .map(|part| part.to_string())
        .find(|part| same(part));
    match found {
        None => Ok(None),
        Some(found) => zip.by_name(&found).map(Some).map_err(|why| of_zip(&why)),
    }
}

fn record(part: &mut impl Read, data: &mut Vec<u8>) -> io::Result<Option<u16>> {
    let mut byte = [0];
    if part.read(&mut byte)? == 0 {
        return Ok(None);
    }
    let mut kind = u16::from(byte[0] & 0x7F);
    if byte[0] & 0x80 != 0 {
        part.read_exact(&mut byte)?;
        kind |= u16::from(byte[0] & 0x7F) << 7;
    }
    let mut length = 0_u64;
    for place in 0..4 {
        part.read_exact(&mut byte)?;
        length |= u64::from(byte[0] & 0x7F) << (7 * place);
        if byte[0] & 0x80 == 0 {
            break;
        }
    }
    data.clear();
    let looked_into = length.min(LOOKED_INTO);
    let read = part.by_ref().take(looked_into).read_to_end(data)? as u64;
    let rest = length - looked_into;
    let passed = io::copy(&mut part.by_ref().take(rest), &mut io::sink())?;
    if read + passed < length {
        return Err(io::ErrorKind::UnexpectedEof.into());
    }
    Ok(Some(kind))
}

/// A text of two-byte characters behind its length, and what follows it.
pub(super) fn wide_text(data: &[u8]) -> Option<(String, &[u8])> {
    let length = usize::try_from(u32_at(data, 0)?).ok()?.checked_mul(2)?;
    let units = data.get(4..)?.get(..length)?;
    let (text, _) = encoding_rs::UTF_16LE.decode_without_bom_handling(units);
    Some((text.into_owned(), data.get(4 + length..)?))
}

pub(super) fn u16_at(data: &[u8], at: usize) -> Option<u16> {
    let bytes = data.get(at..)?.first_chunk::<2>()?;
    Some(u16::from_le_bytes(*bytes))
}

pub(super) fn u32_at(data: &[u8], at: usize) -> Option<u32> {
    let bytes = data.get(at..)?.first_chunk::<4>()?;
    Some(u32::from_le_bytes(*bytes))
}

pub(super) fn f64_at(data: &[u8], at: usize) -> Option<f64> {
    let bytes = data.get(at..)?.first_chunk::<8>()?;
    Some(f64::from_le_bytes(*bytes))
}
