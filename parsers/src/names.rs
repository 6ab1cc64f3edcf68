//! How names are compared: blanks folded, any case; and which known name lies nearest to a wrong one.

/// Longest text quoted in a sentence, in characters.
const QUOTED_MAX: usize = 60;

/// Outer blanks cut, inner runs of blanks (line breaks and no-break spaces too) made one space.
pub(crate) fn fold_blanks(text: &str) -> String {
    let mut folded = String::with_capacity(text.len());
    for word in text.split_whitespace() {
        if !folded.is_empty() {
            folded.push(' ');
        }
        folded.push_str(word);
    }
    folded
}

/// The key under which two spellings of a name are the same: outer blanks cut, inner ones folded, lower case.
#[must_use]
pub fn fold(text: &str) -> String {
    fold_blanks(text).to_lowercase()
}

/// A text short enough to stand in a sentence.
pub(crate) fn shorten(text: &str) -> String {
    shorten_to(text, QUOTED_MAX)
}

/// A text of at most `most` characters.
pub(crate) fn shorten_to(text: &str, most: usize) -> String {
    let folded: String = fold_blanks(text)
        .chars()
        .map(|c| if c.is_control() { '\u{fffd}' } else { c })
        .collect();
    match folded.char_indices().nth(most) {
        None => folded,
        Some((cut, _)) => format!("{}…", &folded[..cut]),
    }
}

/// The known name most like `sought`, if any is like it at all.
#[must_use]
pub fn nearest<'a>(sought: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let sought = fold(sought);
    let mut best: Option<(f64, &str)> = None;
    for name in known
        .into_iter()
        .filter(|name| name.len() <= 4 * QUOTED_MAX)
    {
        let likeness = strsim::normalized_damerau_levenshtein(&sought, &fold(name));
        if likeness >= 0.5 && best.is_none_or(|(most, _)| likeness > most) {
            best = Some((likeness, name));
        }
    }
    best.map(|(_, name)| name)
}

/// Names quoted and listed, the tail counted.
pub(crate) fn listed<'a>(names: impl IntoIterator<Item = &'a str>) -> String {
    const SHOWN: usize = 12;
    let names: Vec<&str> = names.into_iter().collect();
    let shown: Vec<String> = names
        .iter()
        .take(SHOWN)
        .map(|name| format!("`{}`", shorten(name)))
        .collect();
    match names.len() {
        0 => "none".to_owned(),
        n if n > SHOWN => format!("{} and {} more", shown.join(", "), n - SHOWN),
        _ => shown.join(", "),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_break_spaces_and_case_do_not_tell_names_apart() {
        assert_eq!(fold("  Serial\u{a0} \t NO. "), "serial no.");
    }

    #[test]
    fn the_nearest_name_is_like_the_sought_one_or_there_is_none() {
        assert_eq!(
            nearest("Serial no", ["Feature", "serial no.", "Actual"]),
            Some("serial no.")
        );
        assert_eq!(nearest("Serial no.", ["Feature", "Actual"]), None);
    }

    #[test]
    fn long_and_odd_texts_are_fit_for_a_sentence() {
        let shown = shorten(&"ab\u{1b}".repeat(60));
        assert_eq!(shown.chars().count(), QUOTED_MAX + 1);
        assert!(!shown.contains('\u{1b}'));
        assert_eq!(listed(["a"; 14]).matches('`').count(), 24);
    }
}
