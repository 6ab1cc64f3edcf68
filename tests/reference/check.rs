//! Counts correct digits and names the field that lacks them.

use std::collections::BTreeSet;
use std::sync::Mutex;

use serde_json::Value;

/// Where each value of the fixtures lies that a test has asked for.
static COMPARED: Mutex<BTreeSet<usize>> = Mutex::new(BTreeSet::new());

/// Hands over a value for comparison and remembers that.
pub(crate) fn compared(value: &Value) -> &Value {
    let place = std::ptr::from_ref(value) as usize;
    COMPARED.lock().unwrap().insert(place);
    value
}

/// Whether a test has asked for the value.
pub(crate) fn was_compared(value: &Value) -> bool {
    let place = std::ptr::from_ref(value) as usize;
    COMPARED.lock().unwrap().contains(&place)
}

/// Compares many fields and reports all that fall short at once.
pub(crate) struct Check {
    name: String,
    wanted: f64,
    fields: usize,
    short: Vec<String>,
}

impl Check {
    /// A number must have `wanted` correct digits.
    pub(crate) fn new(name: &str, wanted: f64) -> Self {
        Check {
            name: name.to_owned(),
            wanted,
            fields: 0,
            short: Vec::new(),
        }
    }

    /// `found` has the wanted digits of `expected`; a null needs an absent number.
    pub(crate) fn digits(&mut self, field: &str, found: Option<f64>, expected: &Value) {
        match (found, compared(expected).as_f64()) {
            (found, Some(expected)) => self.number(field, found, expected),
            (None, None) => self.fields += 1,
            (Some(found), None) => {
                self.fail(format!("{field}: found {found:e}, expected no number"))
            }
        }
    }

    /// `found` has the wanted digits of `expected`.
    pub(crate) fn number(&mut self, field: &str, found: Option<f64>, expected: f64) {
        self.fields += 1;
        match found {
            None => self.fail(format!("{field}: absent, expected {expected:e}")),
            Some(found) => {
                let digits = digits(found, expected);
                if digits.is_nan() || digits < self.wanted {
                    self.fail(format!(
                        "{field}: found {found:e}, expected {expected:e}: {digits:.1} digits of {}",
                        self.wanted
                    ));
                }
            }
        }
    }

    /// `found` is just `expected`.
    pub(crate) fn same<T: PartialEq + std::fmt::Debug>(
        &mut self,
        field: &str,
        found: T,
        expected: T,
    ) {
        self.fields += 1;
        if found != expected {
            self.fail(format!("{field}: found {found:?}, expected {expected:?}"));
        }
    }

    fn fail(&mut self, what: String) {
        self.short.push(what);
    }

    /// Fails the test when a field fell short, or when fewer fields than stated were compared.
    pub(crate) fn finish(self, fields_at_least: usize) {
        assert!(
            self.fields >= fields_at_least,
            "{}: only {} fields were compared, expected {fields_at_least}",
            self.name,
            self.fields
        );
        assert!(
            self.short.is_empty(),
            "{}: {} of {} fields\n{}",
            self.name,
            self.short.len(),
            self.fields,
            self.short.join("\n")
        );
    }
}

/// Correct digits: minus the log of the relative error.
pub(crate) fn digits(found: f64, expected: f64) -> f64 {
    if found == expected {
        return f64::INFINITY;
    }
    let scale = if expected == 0.0 { 1.0 } else { expected.abs() };
    -((found - expected).abs() / scale).log10()
}
