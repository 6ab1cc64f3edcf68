//! File name patterns, and whether one file name could match two of them.

use globset::{ErrorKind, GlobBuilder, GlobSet, GlobSetBuilder};

use crate::checked::FilePatterns;
use crate::walk::Node;

/// The patterns of a list, all of them sound.
pub(crate) fn patterns(node: &Node<'_>) -> Option<FilePatterns> {
    let mut set = GlobSetBuilder::new();
    let mut written = Vec::new();
    let entries = node.names("file name patterns such as [\"*.xlsx\"]")?;
    for (text, entry) in &entries {
        if text.contains(['/', '\\']) {
            entry.fault_hint(
                "a pattern for the file name alone",
                "sub-folders are watched anyway; name other folders in `folders`",
            );
            continue;
        }
        match GlobBuilder::new(text).case_insensitive(true).build() {
            Ok(glob) => {
                set.add(glob);
                written.push((*text).to_owned());
            }
            Err(error) => entry.fault_hint(
                "a file name pattern such as \"*.xlsx\"",
                in_words(error.kind()),
            ),
        }
    }
    let set: GlobSet = set.build().ok()?;
    (written.len() == entries.len() && !written.is_empty()).then_some(FilePatterns { written, set })
}

fn in_words(why: &ErrorKind) -> String {
    match why {
        ErrorKind::UnclosedClass => "`[` without its `]`",
        ErrorKind::InvalidRange(..) => "a range such as `[a-z]` begins with the lower character",
        ErrorKind::UnopenedAlternates => "`}` without its `{`",
        ErrorKind::UnclosedAlternates => "`{` without its `}`",
        ErrorKind::DanglingEscape => "`\\` at the end stands before nothing",
        _ => "`*` stands for any characters, `?` for one, `{a,b}` for either",
    }
    .to_owned()
}

/// The first two patterns that one file name could match. Never misses an overlap; a character class counts as any character.
pub(crate) fn overlapping<'p>(
    ours: &'p FilePatterns,
    theirs: &'p FilePatterns,
) -> Option<(&'p str, &'p str)> {
    let pairs = ours
        .written
        .iter()
        .flat_map(|a| theirs.written.iter().map(move |b| (a.as_str(), b.as_str())));
    pairs.into_iter().find(|(a, b)| overlap(a, b))
}

#[derive(Debug, Clone, Copy, PartialEq)]
enum Token {
    Literal(char),
    AnyOne,
    AnyMany,
}

fn overlap(a: &str, b: &str) -> bool {
    let (ours, theirs) = (alternatives(a), alternatives(b));
    ours.iter()
        .any(|a| theirs.iter().any(|b| meet(&tokens(a), &tokens(b))))
}

/// The pattern without braces: one text for each choice. Braces beside classes count as any name.
fn alternatives(pattern: &str) -> Vec<String> {
    if pattern.contains('{') && pattern.contains('[') {
        return vec!["*".to_owned()];
    }
    let Some(open) = pattern.find('{') else {
        return vec![pattern.to_owned()];
    };
    let (mut depth, mut close, mut cuts) = (0_usize, None, vec![open]);
    for (index, c) in pattern
        .char_indices()
        .skip_while(|(index, _)| *index < open)
    {
        match c {
            '{' => depth += 1,
            ',' if depth == 1 => cuts.push(index),
            '}' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            close = Some(index);
            break;
        }
    }
    let Some(close) = close else {
        return vec![pattern.replace('{', "*")];
    };
    cuts.push(close);
    let (before, after) = (&pattern[..open], &pattern[close + 1..]);
    cuts.windows(2)
        .flat_map(|cut| alternatives(&format!("{before}{}{after}", &pattern[cut[0] + 1..cut[1]])))
        .collect()
}

fn tokens(pattern: &str) -> Vec<Token> {
    let mut tokens = Vec::new();
    let mut rest = pattern.chars();
    while let Some(c) = rest.next() {
        match c {
            '*' => tokens.push(Token::AnyMany),
            '?' => tokens.push(Token::AnyOne),
            '[' => {
                tokens.push(Token::AnyOne);
                let class = rest.as_str().trim_start_matches(['!', '^']);
                let class = class.strip_prefix(']').unwrap_or(class);
                rest = class.split_once(']').map_or("", |(_, after)| after).chars();
            }
            _ => tokens.extend(c.to_lowercase().map(Token::Literal)),
        }
    }
    tokens
}

/// True when some text matches both: the pairs of positions that can be reached together, step by step.
fn meet(a: &[Token], b: &[Token]) -> bool {
    let width = b.len() + 1;
    let mut reached = vec![false; (a.len() + 1) * width];
    reached[0] = true;
    for i in 0..=a.len() {
        for j in 0..=b.len() {
            if !reached[i * width + j] {
                continue;
            }
            let (ours, theirs) = (a.get(i), b.get(j));
            if ours == Some(&Token::AnyMany) {
                reached[(i + 1) * width + j] = true;
            }
            if theirs == Some(&Token::AnyMany) {
                reached[i * width + j + 1] = true;
            }
            match (ours, theirs) {
                (Some(Token::AnyMany), Some(Token::AnyMany)) | (None, _) | (_, None) => {}
                (Some(Token::AnyMany), Some(_)) => reached[i * width + j + 1] = true,
                (Some(_), Some(Token::AnyMany)) => reached[(i + 1) * width + j] = true,
                (Some(Token::Literal(x)), Some(Token::Literal(y))) if x != y => {}
                (Some(_), Some(_)) => reached[(i + 1) * width + j + 1] = true,
            }
        }
    }
    reached[reached.len() - 1]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn patterns_overlap_when_a_name_matches_both() {
        for (a, b, expected) in [
            ("*.xlsx", "*.XLSX", true),
            ("*.xlsx", "*.xml", false),
            ("hub*.csv", "*grr.csv", true),
            ("hub*.csv", "cover*.csv", false),
            ("*", "a?c", true),
            ("a?c", "abd", false),
            ("*.{csv,txt}", "*.txt", true),
            ("*.{csv,txt}", "*.xml", false),
            ("*.{c{sv,ad},txt}", "*.cad", true),
            ("hub[0-9].csv", "hub7.csv", true),
            ("hub[0-9].csv", "hub77.csv", false),
            ("hub[!]a].csv", "hub7.csv", true),
            ("{hub,[a-c]}.csv", "a.csv", true),
            ("", "", true),
            ("", "*", true),
            ("", "?", false),
        ] {
            assert_eq!(overlap(a, b), expected, "{a} {b}");
            assert_eq!(overlap(b, a), expected, "{b} {a}");
        }
    }

    #[test]
    fn an_overlap_is_seen_whenever_both_globs_match_a_name() {
        let patterns = [
            "*.csv",
            "hub*",
            "*b?.c*",
            "h[tu]b1.csv",
            "{hub,cover}1.csv",
            "?ub*.[ct]*",
            "*1*",
            "cover*",
        ];
        let names = [
            "hub1.csv",
            "cover1.csv",
            "hub.txt",
            "b1.c",
            "x1",
            "HUB1.CSV",
        ];
        let glob = |text: &str| {
            GlobBuilder::new(text)
                .case_insensitive(true)
                .build()
                .unwrap()
                .compile_matcher()
        };
        for a in patterns {
            for b in patterns {
                if names
                    .iter()
                    .any(|name| glob(a).is_match(name) && glob(b).is_match(name))
                {
                    assert!(overlap(a, b), "{a} {b}");
                }
            }
        }
    }
}
