//! Paths to elements and attributes by local name: `/export/run/feature`, `value`, `../@part`.
//!
//! Invariant: a path is absolute and names at least the root element.

use std::fmt;

/// An absolute path.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct XmlPath {
    /// Local names, from the root.
    pub(crate) elements: Vec<String>,
    /// The attribute of the last element; `None`: its text.
    pub(crate) attribute: Option<String>,
    shown: String,
}

impl XmlPath {
    /// The path to an element, as in `/export/run/feature`.
    pub(crate) fn element(text: &str) -> Result<Self, String> {
        let path = Self::from_steps(Vec::new(), text, text.strip_prefix('/'))?;
        match path.attribute {
            None => Ok(path),
            Some(_) => Err(format!(
                "`{text}` is a path to an attribute; expected an element"
            )),
        }
    }

    /// An absolute path, or one relative to the element `self`.
    pub(crate) fn join(&self, text: &str) -> Result<Self, String> {
        match text.strip_prefix('/') {
            Some(steps) => Self::from_steps(Vec::new(), text, Some(steps)),
            None => Self::from_steps(self.elements.clone(), text, Some(text)),
        }
    }

    /// How many leading elements both paths share.
    pub(crate) fn shared(&self, other: &Self) -> usize {
        self.elements
            .iter()
            .zip(&other.elements)
            .take_while(|(a, b)| a == b)
            .count()
    }

    fn from_steps(
        mut elements: Vec<String>,
        text: &str,
        steps: Option<&str>,
    ) -> Result<Self, String> {
        let not_a_path = || {
            format!(
                "`{text}` is not a path such as `/export/run/feature`, `value`, `@id` or `../@part`"
            )
        };
        let mut attribute = None;
        for step in steps.ok_or_else(not_a_path)?.split('/') {
            if attribute.is_some() {
                return Err(not_a_path());
            }
            match step.strip_prefix('@') {
                _ if step == "." => {}
                _ if step == ".." => {
                    elements.pop().ok_or_else(not_a_path)?;
                }
                Some(name) if is_name(name) => attribute = Some(name.to_owned()),
                None if is_name(step) => elements.push(step.to_owned()),
                _ => return Err(not_a_path()),
            }
        }
        if elements.is_empty() {
            return Err(not_a_path());
        }
        let mut shown: String = elements.iter().flat_map(|name| ["/", name]).collect();
        if let Some(attribute) = &attribute {
            shown.push_str("/@");
            shown.push_str(attribute);
        }
        Ok(Self {
            elements,
            attribute,
            shown,
        })
    }
}

/// A local name: no blanks, no marks that mean something in a path or in XML.
fn is_name(name: &str) -> bool {
    !name.is_empty()
        && name
            .chars()
            .all(|c| c.is_alphanumeric() || matches!(c, '_' | '-' | '.' | '\u{b7}'))
}

impl fmt::Display for XmlPath {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.shown)
    }
}

impl XmlPath {
    /// The path as sentences show it.
    pub(crate) fn shown(&self) -> &str {
        &self.shown
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn relative_paths_become_absolute() {
        let each = XmlPath::element("/export/run/feature").unwrap();
        for (text, absolute) in [
            ("value", "/export/run/feature/value"),
            ("@id", "/export/run/feature/@id"),
            ("../@part", "/export/run/@part"),
            (".", "/export/run/feature"),
            ("../../head/operator", "/export/head/operator"),
            ("/export/@id", "/export/@id"),
        ] {
            assert_eq!(
                each.join(text).map(|path| path.to_string()),
                Ok(absolute.to_owned())
            );
        }
    }

    #[test]
    fn what_is_no_path_is_refused() {
        let each = XmlPath::element("/export/run").unwrap();
        for text in [
            "",
            "/",
            "@",
            "a//b",
            "@id/value",
            "../..",
            "../../..",
            "a b",
            "*[1]",
            "x:y",
        ] {
            assert!(each.join(text).is_err(), "{text}");
        }
        assert!(XmlPath::element("export/run").is_err());
        assert!(XmlPath::element("/export/@id").is_err());
    }
}
