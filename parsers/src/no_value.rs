//! Texts that stand where no value was measured.

use crate::number::Number;

/// The texts of a rule, and the numbers they write.
#[derive(Debug, Clone)]
pub(crate) struct NoValue {
    texts: Vec<String>,
    numbers: Vec<f64>,
}

impl NoValue {
    pub(crate) fn new(texts: &[String], mark: char) -> Self {
        let texts: Vec<String> = texts.iter().map(|text| text.trim().to_owned()).collect();
        let numbers = texts
            .iter()
            .filter_map(|text| Number::read(text, mark).ok().map(|number| number.value))
            .collect();
        Self { texts, numbers }
    }

    /// True for the text itself, and for the number it writes written otherwise (`9999` and `9999.000`).
    pub(crate) fn means(&self, text: &str, mark: char) -> bool {
        let text = text.trim();
        self.texts.iter().any(|none| none == text)
            || (!self.numbers.is_empty()
                && Number::read(text, mark)
                    .is_ok_and(|number| self.numbers.contains(&number.value)))
    }

    /// The same for a nominal or a limit, where a zero is a number like any other.
    pub(crate) fn means_no_limit(&self, text: &str, mark: char) -> bool {
        let zero = Number::read(text, mark).is_ok_and(|number| number.value == 0.0);
        !zero && self.means(text, mark)
    }
}
