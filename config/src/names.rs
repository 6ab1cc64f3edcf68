//! Names as people write them: any case, any number of blanks.

/// The form in which two spellings of one name are equal: lower case, blanks folded into one and trimmed.
#[must_use]
pub fn fold(name: &str) -> String {
    name.split_whitespace()
        .map(str::to_lowercase)
        .collect::<Vec<_>>()
        .join(" ")
}

/// The candidate that is most likely meant by `name`, if any is close.
pub(crate) fn nearest<'a>(
    name: &str,
    candidates: impl IntoIterator<Item = &'a str>,
) -> Option<&'a str> {
    let wanted = fold(name);
    let length = wanted.chars().count();
    let farthest = (length / 3).max(1).min(length.saturating_sub(1));
    candidates
        .into_iter()
        .map(|candidate| (strsim::osa_distance(&wanted, &fold(candidate)), candidate))
        .filter(|(distance, _)| *distance <= farthest)
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, candidate)| candidate)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn case_and_blanks_do_not_tell_names_apart() {
        assert_eq!(fold("  Bore\u{a0} A\t12 "), "bore a 12");
        assert_eq!(fold("ÅSE"), "åse");
        assert_eq!(fold(" \t"), "");
    }

    #[test]
    fn nearest_takes_the_closest_and_nothing_far() {
        let keys = ["settle", "sheet", "same", "to"];
        assert_eq!(nearest("setle", keys), Some("settle"));
        assert_eq!(nearest("ot", keys), Some("to"));
        assert_eq!(nearest("decimal", keys), None);
        assert_eq!(nearest(";", [".", ","]), None);
        assert_eq!(nearest("", keys), None);
    }
}
