//! The unit in which lengths of a picture or a table are shown: µm where mm would be mostly zeros.

use super::words::{NBSP, short, three_digits};

/// Lengths in mm below this are shown in µm.
const SMALL_MM: f64 = 0.1;

/// A unit to show numbers in.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Unit {
    factor: f64,
    name: String,
}

impl Unit {
    /// The unit for lengths up to `size`, which are kept in `unit`.
    pub(super) fn for_size(unit: Option<&str>, size: f64) -> Unit {
        let name = unit.unwrap_or_default().trim();
        if name.eq_ignore_ascii_case("mm") && size.abs() < SMALL_MM {
            Unit {
                factor: 1000.0,
                name: "µm".to_owned(),
            }
        } else {
            Unit {
                factor: 1.0,
                name: name.to_owned(),
            }
        }
    }

    /// Its name; empty when the readings have none.
    pub(super) fn name(&self) -> &str {
        &self.name
    }

    /// A length in this unit, as a number.
    pub(super) fn of(&self, x: f64) -> f64 {
        self.factor * x
    }

    /// Three significant digits with the unit.
    pub(super) fn three_digits(&self, x: f64) -> String {
        self.named(three_digits(self.of(x)))
    }

    /// At most four significant digits with the unit.
    pub(super) fn short(&self, x: f64) -> String {
        self.named(short(self.of(x)))
    }

    /// A squared length, three significant digits, without the unit.
    pub(super) fn squared(&self, x: f64) -> String {
        three_digits(self.factor * self.factor * x)
    }

    /// The unit of squared lengths.
    pub(super) fn squared_name(&self) -> String {
        if self.name.is_empty() {
            String::new()
        } else {
            format!("{}²", self.name)
        }
    }

    fn named(&self, number: String) -> String {
        if self.name.is_empty() {
            number
        } else {
            format!("{number}{NBSP}{}", self.name)
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn small_millimetres_are_micrometres() {
        let small = Unit::for_size(Some("mm"), 0.0016);
        assert_eq!(small.three_digits(0.001_567_8), format!("1.57{NBSP}µm"));
        assert_eq!(small.squared(1.531e-4), "153");
        assert_eq!(small.squared_name(), "µm²");
        assert_eq!(
            Unit::for_size(Some("mm"), 0.2).short(0.2),
            format!("0.2{NBSP}mm")
        );
        assert_eq!(Unit::for_size(None, 0.002).short(0.002), "0.002");
        assert_eq!(
            Unit::for_size(Some("°"), 0.002).short(0.002),
            format!("0.002{NBSP}°")
        );
    }
}
