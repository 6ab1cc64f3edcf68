//! The line of a byte position; the XML reader knows positions only.

/// Counts lines as far as the document has been read.
pub(super) struct Lines<'a> {
    bytes: &'a [u8],
    at: usize,
    line: u32,
}

impl<'a> Lines<'a> {
    pub(super) fn new(text: &'a str) -> Self {
        Self {
            bytes: text.as_bytes(),
            at: 0,
            line: 1,
        }
    }

    /// The line, from 1, of a byte position that lies no further back than the last one asked for.
    pub(super) fn line_of(&mut self, position: u64) -> u32 {
        let until = usize::try_from(position)
            .unwrap_or(usize::MAX)
            .min(self.bytes.len());
        if until > self.at {
            let passed = self.bytes[self.at..until]
                .iter()
                .filter(|&&byte| byte == b'\n')
                .count();
            self.line = self
                .line
                .saturating_add(u32::try_from(passed).unwrap_or(u32::MAX));
            self.at = until;
        }
        self.line
    }
}
