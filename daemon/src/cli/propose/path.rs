//! Roles that stand in file names: a word of the trade and what follows it, `run-2`, `Teil_07`.

use regex::Regex;

use super::words::{Meaning, words_of};

/// The regex that takes the role out of every file's name, and what it takes out of the first.
pub(super) fn found(meaning: Meaning, files: &[&str]) -> Option<(String, String)> {
    let content = match meaning {
        Meaning::Trial => r"\d+",
        Meaning::Part => r"[\p{L}\p{N}]*\d",
        Meaning::Appraiser => r"\p{L}{1,12}",
        _ => return None,
    };
    words_of(meaning)
        .filter(|word| word.chars().count() > 2 && !word.contains(' '))
        .find_map(|word| {
            let pattern = format!(
                r"(?i)(?:^|[^\p{{L}}]){}[-_ ]?({content})(?:[^\p{{L}}\p{{N}}]|$)",
                regex::escape(word)
            );
            let regex = Regex::new(&pattern).ok()?;
            let taken = |file: &&str| {
                let found = regex.captures(file)?.get(1)?;
                Some(found.as_str().to_owned())
            };
            let all: Option<Vec<String>> = files.iter().map(taken).collect();
            let first = all?.into_iter().next()?;
            let short = format!(r"(?i){}[-_ ]?({content})", regex::escape(word));
            Some((short, first))
        })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_word_before_it_makes_a_role_and_a_bare_number_none() {
        let trial = |files: &[&str]| found(Meaning::Trial, files);
        assert_eq!(
            trial(&["P03 KL run-2.csv", "P04 KL run-3.csv"]),
            Some((r"(?i)run[-_ ]?(\d+)".into(), "2".into()))
        );
        assert_eq!(trial(&["P03 run-2.csv", "P04-3.csv"]), None);
        assert_eq!(trial(&["trunk2.csv"]), None);
        assert_eq!(
            found(Meaning::Part, &["Teil_07 Lauf 2.csv"]),
            Some((r"(?i)teil[-_ ]?([\p{L}\p{N}]*\d)".into(), "07".into()))
        );
    }
}
