//! The draft: lines of TOML, each with what was seen for it and whether a person has to look.
//!
//! Invariant: whatever an export holds stands in the draft inside a quoted string or, cut to plain characters,
//! in a comment; it cannot become a line of its own.

use serde::Serialize;

/// How far a line can be trusted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub(super) enum Trust {
    /// Seen as it stands.
    Seen,
    /// A guess that a person has to check.
    Check,
    /// Not found and not needed: a commented line.
    Optional,
    /// Not found, and nothing can be read without it: a commented line.
    Missing,
}

/// One key of the draft.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub(super) struct Line {
    /// The table it belongs to: `instrument` or `instrument.read`.
    pub(super) table: &'static str,
    pub(super) key: &'static str,
    /// As TOML.
    pub(super) value: String,
    pub(super) trust: Trust,
    /// What was seen, or what to fill in.
    pub(super) note: String,
}

const KEY_WIDTH: usize = 14;
const NOTE_AT: usize = 52;

impl Line {
    pub(super) fn new(
        table: &'static str,
        key: &'static str,
        value: impl Into<String>,
        trust: Trust,
        note: impl Into<String>,
    ) -> Self {
        Self {
            table,
            key,
            value: value.into(),
            trust,
            note: note.into(),
        }
    }

    fn written(&self) -> String {
        let Self {
            key, value, note, ..
        } = self;
        let (before, mark) = match self.trust {
            Trust::Seen => ("", ""),
            Trust::Check => ("", "check: "),
            Trust::Optional => ("# ", "not found: "),
            Trust::Missing => ("# ", "MISSING: "),
        };
        let width = KEY_WIDTH - before.len();
        let line = format!("{before}{key:<width$} = {value}");
        if note.is_empty() {
            return line;
        }
        format!("{line:<NOTE_AT$} # {mark}{}", plain(note))
    }
}

/// The whole draft, with `head` as comments before it.
pub(super) fn written(head: &[String], lines: &[Line]) -> String {
    let mut out = String::new();
    for sentence in head {
        out.push_str(&format!("# {}\n", plain(sentence)));
    }
    let mut table = "";
    for line in lines {
        if line.table != table {
            table = line.table;
            out.push_str(&match table {
                "instrument" => format!("\n[[{table}]]\n"),
                _ => format!("\n[{table}]\n"),
            });
        }
        out.push_str(&line.written());
        out.push('\n');
    }
    out
}

/// A text as a TOML string: literal where that reads better and can be.
pub(super) fn quoted(text: &str) -> String {
    if text.contains('\\') && !text.contains('\'') && !text.chars().any(char::is_control) {
        return format!("'{text}'");
    }
    let mut out = String::from("\"");
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\t' => out.push_str("\\t"),
            c if c.is_control() => out.push_str(&format!("\\u{:04X}", u32::from(c))),
            c => out.push(c),
        }
    }
    out.push('"');
    out
}

/// Fit for a comment: one line, no control characters.
pub(super) fn plain(text: &str) -> String {
    text.chars()
        .map(|c| {
            if c.is_control() || matches!(c, '\u{2028}' | '\u{2029}') {
                ' '
            } else {
                c
            }
        })
        .collect()
}

/// A text that an export holds, as a comment quotes it.
pub(super) fn shown(text: &str) -> String {
    const MOST: usize = 40;
    let short: String = text.chars().take(MOST).collect();
    let more = if text.chars().count() > MOST {
        "…"
    } else {
        ""
    };
    format!("`{}{more}`", plain(&short))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_an_export_holds_stays_in_its_line() {
        let line = Line::new(
            "instrument.read",
            "part",
            format!("{{ column = {} }}", quoted("a\n[mail]\"\\\u{7f}")),
            Trust::Check,
            format!("found {}", shown("x\n[mail]\r\u{2028}")),
        );
        let text = written(&[], &[line]);
        assert_eq!(text.lines().count(), 3, "{text}");
        assert!(
            text.contains(r#"{ column = "a\u000A[mail]\"\\\u007F" }"#),
            "{text}"
        );
    }

    #[test]
    fn regexes_are_literal() {
        assert_eq!(quoted(r"run-(\d+)"), r"'run-(\d+)'");
        assert_eq!(quoted(r"o'(\d+)"), r#""o'(\\d+)""#);
    }
}
