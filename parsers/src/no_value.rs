//! Texts that stand where no value was measured.

use crate::names::fold;
use crate::number::{Marks, Quantity};

/// The texts of a rule, and the numbers they write.
#[derive(Debug, Clone)]
pub(crate) struct NoValue {
    /// Folded.
    texts: Vec<String>,
    numbers: Vec<f64>,
}

impl NoValue {
    pub(crate) fn new(texts: &[String], marks: Marks) -> Self {
        let texts: Vec<String> = texts.iter().map(|text| fold(text)).collect();
        let numbers = texts
            .iter()
            .filter_map(|text| number(text, marks))
            .collect();
        Self { texts, numbers }
    }

    /// True for the text itself in any case, and for the number it writes written otherwise (`9999`,
    /// `9999.000` and `9999.0 mm`).
    pub(crate) fn means(&self, text: &str, marks: Marks) -> bool {
        let is_listed = || {
            let text = fold(text);
            self.texts.contains(&text)
        };
        let is_number = || number(text, marks).is_some_and(|number| self.numbers.contains(&number));
        (!self.texts.is_empty() && is_listed()) || (!self.numbers.is_empty() && is_number())
    }

    /// The same for a nominal or a limit, where a zero is a number like any other.
    pub(crate) fn means_no_limit(&self, text: &str, marks: Marks) -> bool {
        self.means(text, marks) && number(text, marks) != Some(0.0)
    }

    /// True when nothing at all stands for no value.
    pub(crate) fn is_blank(&self) -> bool {
        self.texts.iter().any(String::is_empty)
    }
}

fn number(text: &str, marks: Marks) -> Option<f64> {
    let quantity = Quantity::read(text, marks).ok()?;
    Some(quantity.number.value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn texts_in_any_case_and_numbers_however_written() {
        let texts = ["---", "9999", "NaN", "-inf", "n. c."].map(str::to_owned);
        let comma = Marks {
            decimal: ',',
            thousands: Some('.'),
        };
        let none = NoValue::new(&texts, comma);
        for text in [
            " --- ", "9999", "9999,000", "9.999", "+9999 mm", "nan", "NAN", "-INF", "N.  C.",
        ] {
            assert!(none.means(text, comma), "{text}");
        }
        for text in ["--", "99,99", "-9999", "0", "inf", ""] {
            assert!(!none.means(text, comma), "{text}");
        }
        assert!(none.means("9999.0", Marks::PLAIN));
    }

    #[test]
    fn a_zero_is_a_limit_like_any_other() {
        let none = NoValue::new(&["0".to_owned(), "---".to_owned()], Marks::PLAIN);
        assert!(none.means("0.000", Marks::PLAIN));
        assert!(!none.means_no_limit("0.000", Marks::PLAIN));
        assert!(none.means_no_limit("---", Marks::PLAIN));
    }
}
