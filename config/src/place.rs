//! Texts that say where something stands: cell names, XML paths, regexes.

use crate::walk::Node;

/// Row and column, from 0, of a cell named as in `B4`; within what a workbook can hold.
pub(crate) fn cell(name: &str) -> Option<(u32, u32)> {
    const ROWS: u32 = 1 << 20;
    const COLUMNS: u32 = 1 << 14;
    let letters = name.find(|c: char| !c.is_ascii_uppercase())?;
    let (letters, digits) = name.split_at(letters);
    if letters.is_empty()
        || letters.len() > 3
        || digits.starts_with('0')
        || !digits.bytes().all(|b| b.is_ascii_digit())
    {
        return None;
    }
    let column = letters.bytes().fold(0, |column, letter| {
        column * 26 + u32::from(letter - b'A') + 1
    });
    let row: u32 = digits.parse().ok()?;
    (column <= COLUMNS && row <= ROWS).then(|| (row - 1, column - 1))
}

/// The number, from 0, of the column with that letter, as in `F`.
pub(crate) fn letter(node: &Node<'_>) -> Option<u32> {
    let column = cell(&format!("{}1", node.text()?)).filter(|(row, _)| *row == 0);
    if column.is_none() {
        node.fault("the letter of a column such as \"F\"");
    }
    column.map(|(_, column)| column)
}

/// True for an absolute path of local element names, `/export/run/feature`.
pub(crate) fn is_each(path: &str) -> bool {
    path.strip_prefix('/')
        .is_some_and(|names| names.split('/').all(is_xml_name))
}

/// True for the path of an element or attribute: absolute, or relative to an element `depth` below the
/// document with leading `..` steps; `@name` only last. What it names lies within the document.
pub(crate) fn is_xml_path(path: &str, depth: usize) -> bool {
    let absolute = path.strip_prefix('/');
    let (steps, mut reached) = (
        absolute.unwrap_or(path),
        if absolute.is_some() { 0 } else { depth },
    );
    let last = steps.split('/').count() - 1;
    let mut rising = absolute.is_none();
    let are_steps = steps.split('/').enumerate().all(|(index, step)| {
        if step == ".." {
            reached = reached.saturating_sub(1);
            return rising && index < last;
        }
        rising = false;
        match step.strip_prefix('@') {
            Some(attribute) => index == last && is_xml_name(attribute),
            None if path == "." => true,
            None => {
                reached = reached.saturating_add(1);
                is_xml_name(step)
            }
        }
    });
    let rises = steps.split('/').take_while(|step| *step == "..").count();
    are_steps && rises <= depth && reached > 0
}

fn is_xml_name(name: &str) -> bool {
    name.starts_with(|c: char| c.is_alphabetic() || c == '_')
        && name
            .chars()
            .all(|c| c.is_alphanumeric() || "_-.".contains(c))
}

/// A regex that compiles; its `groups` at most.
pub(crate) fn regex(node: &Node<'_>, groups: usize) -> Option<regex::Regex> {
    let text = node.text()?;
    if text.is_empty() {
        node.fault("a regular expression");
        return None;
    }
    match regex::Regex::new(text) {
        Ok(regex) if regex.captures_len() - 1 > groups => {
            node.fault_hint(
                "a regular expression with one group at most",
                "the group is what is taken; write the others as (?:…)",
            );
            None
        }
        Ok(regex) => Some(regex),
        Err(error) => {
            let why = error.to_string();
            let last = why
                .lines()
                .last()
                .unwrap_or_default()
                .trim_start_matches("error: ")
                .to_owned();
            node.fault_hint("a regular expression", last);
            None
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cells_are_named_by_column_letters_and_row() {
        for (name, place) in [
            ("A1", (0, 0)),
            ("B4", (3, 1)),
            ("Z10", (9, 25)),
            ("AA1", (0, 26)),
            ("XFD1048576", (1_048_575, 16_383)),
        ] {
            assert_eq!(cell(name), Some(place), "{name}");
        }
        for name in [
            "",
            "B",
            "4",
            "4B",
            "b4",
            "$B$4",
            "B0",
            "B04",
            "B4 ",
            "XFE1",
            "A1048577",
            "AAAA1",
            "B4:C5",
            "Ä1",
            "B99999999999",
        ] {
            assert_eq!(cell(name), None, "{name}");
        }
    }

    #[test]
    fn xml_paths_are_local_names() {
        for path in [
            "value",
            "@id",
            "../@part",
            "/export/run/@id",
            "../../head/who",
            ".",
        ] {
            assert!(is_xml_path(path, 3), "{path}");
        }
        for path in [
            "",
            "/",
            "a//b",
            "@id/value",
            "/../a",
            "a/../b",
            "..",
            "q:value",
            "a b",
            "//value",
            "value[1]",
            "../.",
        ] {
            assert!(!is_xml_path(path, 3), "{path}");
        }
        for (path, depth, within) in [
            ("../@part", 2, true),
            ("../@part", 1, false),
            ("../../who", 2, true),
            ("../../../who", 2, false),
            ("/@id", 3, false),
            ("@id", 1, true),
        ] {
            assert_eq!(is_xml_path(path, depth), within, "{path} at {depth}");
        }
        assert!(is_each("/export/run/feature"));
        for path in ["export/run", "/", "", "/export/@id", "/a//b", "/a/../b"] {
            assert!(!is_each(path), "{path}");
        }
    }
}
