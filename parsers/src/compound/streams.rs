//! The streams of a compound file ([MS-CFB]), as tolerant as the readers of workbooks are: chains of
//! sectors, and of small sectors for short streams. A chain is no longer than the file.

/// What stands in a chain's last place.
const LAST_SECTOR: u32 = 0xFFFF_FFFA;
/// Streams shorter than this lie in small sectors.
const SHORT: u64 = 4096;
const SMALL_SECTOR: usize = 64;
const ENTRY: usize = 128;

pub(super) struct Streams<'a> {
    bytes: &'a [u8],
    sector: usize,
    next: Vec<u32>,
    next_small: Vec<u32>,
    small: Vec<u8>,
    entries: Vec<Entry>,
}

struct Entry {
    name: String,
    is_stream: bool,
    start: u32,
    length: u64,
}

impl<'a> Streams<'a> {
    /// `None` when the file is cut short or damaged.
    pub(super) fn open(bytes: &'a [u8]) -> Option<Self> {
        let sector = match u16_at(bytes, 30)? {
            9 => 512,
            12 => 4096,
            _ => return None,
        };
        let mut streams = Self {
            bytes,
            sector,
            next: Vec::new(),
            next_small: Vec::new(),
            small: Vec::new(),
            entries: Vec::new(),
        };
        streams.next = streams.table()?;
        let directory = streams.chain(u32_at(bytes, 48)?, None)?;
        if directory.len() % sector != 0 {
            return None;
        }
        streams.entries = directory.chunks_exact(ENTRY).filter_map(entry).collect();
        let root = directory.first_chunk::<ENTRY>()?;
        let small_table = streams.chain(u32_at(bytes, 60)?, None)?;
        streams.next_small = numbers(&small_table).collect();
        streams.small = streams.chain(u32_at(root, 116)?, None)?;
        Some(streams)
    }

    pub(super) fn has(&self, name: &str) -> bool {
        self.named(name).is_some()
    }

    /// All bytes of a stream; `None` when some are missing.
    pub(super) fn read(&self, name: &str) -> Option<Vec<u8>> {
        let entry = self.named(name)?;
        let length = usize::try_from(entry.length).ok()?;
        let mut bytes = if entry.length < SHORT {
            self.small_chain(entry.start, length)?
        } else {
            self.chain(entry.start, Some(length))?
        };
        if bytes.len() < length {
            return None;
        }
        bytes.truncate(length);
        Some(bytes)
    }

    fn named(&self, name: &str) -> Option<&Entry> {
        self.entries
            .iter()
            .find(|entry| entry.is_stream && entry.name.eq_ignore_ascii_case(name))
    }

    /// By sector, the next one of its chain.
    fn table(&self) -> Option<Vec<u32>> {
        let mut holders: Vec<u32> = numbers(self.bytes.get(76..512)?).collect();
        let mut more = u32_at(self.bytes, 68)?;
        let most = self.bytes.len() / self.sector;
        for _ in 0..=most {
            if more >= LAST_SECTOR {
                break;
            }
            let mut listed: Vec<u32> = numbers(self.sector(more)?).collect();
            more = listed.pop()?;
            holders.extend(listed);
        }
        let mut next = Vec::new();
        for holder in holders.into_iter().filter(|holder| *holder < LAST_SECTOR) {
            next.extend(numbers(self.sector(holder)?));
            if next.len() > (most + 1) * self.sector {
                return None;
            }
        }
        Some(next)
    }

    /// The last sector of a file may be short.
    fn sector(&self, number: u32) -> Option<&'a [u8]> {
        let start = (number as usize + 1).checked_mul(self.sector)?;
        let rest = self.bytes.get(start..).filter(|rest| !rest.is_empty())?;
        Some(&rest[..rest.len().min(self.sector)])
    }

    fn chain(&self, start: u32, length: Option<usize>) -> Option<Vec<u8>> {
        let mut bytes = Vec::new();
        let mut at = start;
        while at < LAST_SECTOR && length.is_none_or(|length| bytes.len() < length) {
            bytes.extend(self.sector(at)?);
            if bytes.len() > self.bytes.len() {
                return None;
            }
            at = *self.next.get(at as usize)?;
        }
        Some(bytes)
    }

    fn small_chain(&self, start: u32, length: usize) -> Option<Vec<u8>> {
        let mut bytes = Vec::new();
        let mut at = start;
        while at < LAST_SECTOR && bytes.len() < length {
            let from = (at as usize).checked_mul(SMALL_SECTOR)?;
            let rest = self.small.get(from..).filter(|rest| !rest.is_empty())?;
            bytes.extend(&rest[..rest.len().min(SMALL_SECTOR)]);
            at = *self.next_small.get(at as usize)?;
        }
        Some(bytes)
    }
}

fn entry(bytes: &[u8]) -> Option<Entry> {
    let length = usize::from(u16_at(bytes, 64)?).saturating_sub(2).min(62);
    let units: Vec<u16> = bytes[..length]
        .chunks_exact(2)
        .map(|unit| u16::from_le_bytes([unit[0], unit[1]]))
        .collect();
    Some(Entry {
        name: String::from_utf16_lossy(&units),
        is_stream: bytes[66] == 2,
        start: u32_at(bytes, 116)?,
        // Only the low half is sure in files of small sectors.
        length: u64::from(u32_at(bytes, 120)?),
    })
}

fn numbers(bytes: &[u8]) -> impl Iterator<Item = u32> {
    bytes
        .chunks_exact(4)
        .map(|b| u32::from_le_bytes([b[0], b[1], b[2], b[3]]))
}

pub(super) fn u16_at(data: &[u8], at: usize) -> Option<u16> {
    let bytes = data.get(at..)?.first_chunk::<2>()?;
    Some(u16::from_le_bytes(*bytes))
}

pub(super) fn u32_at(data: &[u8], at: usize) -> Option<u32> {
    let bytes = data.get(at..)?.first_chunk::<4>()?;
    Some(u32::from_le_bytes(*bytes))
}
