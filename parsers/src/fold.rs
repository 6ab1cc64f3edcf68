//! How names are compared everywhere: any case, blanks folded.

/// The comparable form of a name: trimmed, runs of blanks (also no-break ones) as one space, lower case.
#[must_use]
pub fn fold(name: &str) -> String {
    name.split_whitespace().collect::<Vec<_>>().join(" ").to_lowercase()
}
