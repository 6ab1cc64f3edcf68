//! One thing that is wrong with a configuration file.

use std::fmt;

/// Where, what was found, what was expected, and what to do.
#[derive(Debug, Clone, PartialEq, Eq, serde::Serialize)]
pub struct Fault {
    /// The file as it was named by the caller.
    pub file: String,
    /// Line, from 1.
    pub line: usize,
    /// The key with its tables: `instrument "bridge-1" . read . decimal`.
    pub key: String,
    /// What stands there.
    pub found: String,
    /// What was expected.
    pub expected: String,
    /// What a person could do.
    pub hint: Option<String>,
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{}:{}: {}: found {}, expected {}",
            self.file, self.line, self.key, self.found, self.expected
        )
    }
}
