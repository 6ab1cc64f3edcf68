//! The grammar of numbers: a sign, digits with at most one decimal mark, an exponent; between groups of
//! three digits a mark for thousands, when the rule states one; a unit behind them, when it is asked for.
//!
//! Not here: what a unit means, spelled numbers, infinities. A text that could be two numbers is no
//! number.
//!
//! Invariant: a [`Number`] is finite, and is zero only when its text says zero.

use crate::decimal::{exact_quotient, exact_sum, parts};
use crate::names::shorten;
use crate::sexagesimal::sexagesimal;

/// Blanks that stand between thousands; a rule that names one means any of them.
const BLANKS: [char; 4] = [' ', '\u{a0}', '\u{2009}', '\u{202f}'];
const APOSTROPHES: [char; 2] = ['\'', '\u{2019}'];

/// The marks that one instrument writes numbers with.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Marks {
    pub(crate) decimal: char,
    /// Between groups of three digits.
    pub(crate) thousands: Option<char>,
}

impl Marks {
    /// As numbers stand in a rule.
    pub(crate) const PLAIN: Self = Self {
        decimal: '.',
        thousands: None,
    };

    /// # Errors
    /// What is wrong with them, and with which of the two keys.
    pub(crate) fn new(
        decimal: char,
        thousands: Option<char>,
    ) -> Result<Self, (&'static str, String)> {
        if !matches!(decimal, '.' | ',') {
            return Err(("decimal", format!("`{decimal}` is neither `.` nor `,`")));
        }
        match thousands {
            Some(mark) if mark == decimal => {
                Err(("thousands", format!("`{mark}` is the decimal mark as well")))
            }
            Some(mark)
                if !matches!(mark, '.' | ',')
                    && !BLANKS.contains(&mark)
                    && !APOSTROPHES.contains(&mark) =>
            {
                Err((
                    "thousands",
                    format!("`{mark}` is none of `.`, `,`, a blank and `'`"),
                ))
            }
            _ => Ok(Self { decimal, thousands }),
        }
    }

    fn is_thousands(self, found: char) -> bool {
        let alike = |marks: &[char], mark| marks.contains(&mark) && marks.contains(&found);
        self.thousands
            .is_some_and(|mark| mark == found || alike(&BLANKS, mark) || alike(&APOSTROPHES, mark))
    }

    /// What numbers look like, for sentences.
    pub(crate) fn expected(self) -> String {
        match self.thousands {
            None => format!("a number with the decimal mark `{}`", self.decimal),
            Some(mark) => format!(
                "a number with the decimal mark `{}` and `{mark}` between thousands",
                self.decimal
            ),
        }
    }
}

/// A number and the decimal text it was written as.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Number {
    pub(crate) value: f64,
    /// ASCII, with a point.
    written: String,
}

/// A number with what stands behind it.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Quantity {
    pub(crate) number: Number,
    /// As written; begins like a unit.
    pub(crate) suffix: Option<String>,
}

/// Why a text is no number, or not the one that is wanted.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct NotANumber {
    pub(crate) wrong: String,
    pub(crate) hint: Option<String>,
}

impl NotANumber {
    pub(crate) fn new(wrong: impl Into<String>, hint: impl Into<String>) -> Self {
        Self {
            wrong: wrong.into(),
            hint: Some(hint.into()),
        }
    }

    fn at_all(text: &str, marks: Marks) -> Self {
        let thousands = match marks.thousands {
            None => String::new(),
            Some(mark) => format!(" and `{mark}` stands between thousands"),
        };
        Self {
            wrong: format!(
                "`{}` is not a number; this instrument's decimal mark is `{}`{thousands}",
                shorten(text),
                marks.decimal
            ),
            hint: hint(text, marks),
        }
    }
}

impl Quantity {
    /// The number that `text` writes, and the unit behind it, if any.
    pub(crate) fn read(text: &str, marks: Marks) -> Result<Self, NotANumber> {
        let text = text.trim();
        if let Some(degrees) = sexagesimal(text, marks) {
            return match degrees {
                Some(number) => Ok(Self {
                    number,
                    suffix: Some("°".to_owned()),
                }),
                None => Err(NotANumber::new(
                    format!("`{}` is no angle", shorten(text)),
                    "angles are written as `12°30'15\"`, with less than 60 minutes and seconds",
                )),
            };
        }
        let Some((written, suffix)) = scan(text, marks) else {
            return Err(NotANumber::at_all(text, marks));
        };
        let suffix = suffix.trim_start();
        if !suffix.is_empty() && !begins_like_a_unit(suffix) {
            return Err(NotANumber::at_all(text, marks));
        }
        Ok(Self {
            number: Number::parse(text, written)?,
            suffix: (!suffix.is_empty()).then(|| suffix.to_owned()),
        })
    }

    /// A number without a unit.
    pub(crate) fn bare(number: Number) -> Self {
        Self {
            number,
            suffix: None,
        }
    }
}

impl Number {
    /// A number of a workbook, taken as the shortest decimal text that means it; `None` unless finite.
    pub(crate) fn of(value: f64) -> Option<Self> {
        value.is_finite().then(|| Self {
            value,
            written: format!("{value:e}"),
        })
    }

    /// The number that `text` writes, and nothing else. Blanks around it are cut.
    pub(crate) fn read(text: &str, marks: Marks) -> Result<Self, NotANumber> {
        let text = text.trim();
        match scan(text, marks) {
            Some((written, "")) => Self::parse(text, written),
            _ => Err(NotANumber::at_all(text, marks)),
        }
    }

    /// From a plain decimal text; `text` is what the export holds.
    pub(crate) fn parse(text: &str, written: String) -> Result<Self, NotANumber> {
        let out_of_range = |what: &str| NotANumber {
            wrong: format!("`{}` is too {what} for a number", shorten(text)),
            hint: None,
        };
        match written.parse::<f64>() {
            Ok(value) if !value.is_finite() => Err(out_of_range("large")),
            Ok(value) if value == 0.0 && !zero(&written) => Err(out_of_range("small")),
            Ok(value) => Ok(Self { value, written }),
            Err(_) => Err(out_of_range("long")),
        }
    }

    /// The number nearest to the exact decimal sum of both texts; the floating sum when that does
    /// not fit 37 digits. `None` when the sum is not finite.
    pub(crate) fn plus(&self, other: &Self) -> Option<f64> {
        exact_sum(&self.written, &other.written)
            .or(Some(self.value + other.value))
            .filter(|sum| sum.is_finite())
    }

    /// The decimal text times `over / under`, to at least 25 digits; in floating point when it does not
    /// fit 37. `None` when the product is not finite.
    pub(crate) fn times(&self, over: i128, under: i128) -> Option<Self> {
        let exact = || {
            let (digits, power) = parts(&self.written)?;
            let written = exact_quotient(digits.checked_mul(over)?, power, under)?;
            Self::parse(&written, written.clone()).ok()
        };
        let floating = || Self::of(self.value * over as f64 / under as f64);
        exact()
            .or_else(floating)
            .filter(|product| product.value != 0.0 || self.value == 0.0)
    }
}

fn take_digits<'t>(rest: &mut &'t str) -> &'t str {
    let end = rest
        .find(|c: char| !c.is_ascii_digit())
        .unwrap_or(rest.len());
    let (digits, after) = rest.split_at(end);
    *rest = after;
    digits
}

pub(crate) fn take_sign(rest: &mut &str) -> &'static str {
    let mut chars = rest.chars();
    match chars.next() {
        Some('+') => {
            *rest = chars.as_str();
            ""
        }
        Some('-' | '\u{2212}') => {
            *rest = chars.as_str();
            "-"
        }
        _ => "",
    }
}

/// The number that the text begins with, as a plain decimal text, and what stands behind it.
pub(crate) fn scan(text: &str, marks: Marks) -> Option<(String, &str)> {
    let mut rest = text;
    let mut written = String::with_capacity(text.len());
    written.push_str(take_sign(&mut rest));
    let whole = take_digits(&mut rest);
    written.push_str(whole);
    if (1..=3).contains(&whole.len()) && !whole.starts_with('0') {
        while let Some((group, after)) = group(rest, marks) {
            written.push_str(group);
            rest = after;
        }
    }
    if let Some(mut after) = rest.strip_prefix(marks.decimal) {
        if whole.is_empty() {
            written.push('0');
        }
        let fraction = take_digits(&mut after);
        if fraction.is_empty() {
            return None;
        }
        written.push('.');
        written.push_str(fraction);
        rest = after;
    } else if whole.is_empty() {
        return None;
    }
    if let Some(mut after) = rest.strip_prefix(['e', 'E']) {
        let sign = take_sign(&mut after);
        let exponent = take_digits(&mut after);
        if !exponent.is_empty() {
            written.extend(["e", sign, exponent]);
            rest = after;
        }
    }
    Some((written, rest))
}

/// The next three digits behind a mark for thousands.
fn group(rest: &str, marks: Marks) -> Option<(&str, &str)> {
    let mark = rest.chars().next().filter(|&c| marks.is_thousands(c))?;
    let mut after = &rest[mark.len_utf8()..];
    let digits = take_digits(&mut after);
    (digits.len() == 3).then_some((digits, after))
}

fn begins_like_a_unit(suffix: &str) -> bool {
    let is_quote = |c| {
        matches!(
            c,
            '\'' | '"' | '\u{2019}' | '\u{201d}' | '\u{2032}' | '\u{2033}'
        )
    };
    suffix.chars().next().is_some_and(|first| {
        first.is_alphabetic()
            || matches!(first, '°' | '%' | '‰' | '\u{3380}'..='\u{33df}')
            || (is_quote(first) && !suffix.contains(|c: char| c.is_ascii_digit()))
    })
}

fn zero(written: &str) -> bool {
    let mantissa = written.split('e').next().unwrap_or(written);
    !mantissa.bytes().any(|b| (b'1'..=b'9').contains(&b))
}

fn hint(text: &str, marks: Marks) -> Option<String> {
    let reads = |marks: Marks| {
        scan(text, marks)
            .is_some_and(|(_, rest)| rest.is_empty() || begins_like_a_unit(rest.trim_start()))
    };
    let other = if marks.decimal == ',' { '.' } else { ',' };
    let turned = reads(Marks {
        decimal: other,
        thousands: None,
    });
    let separator = ['.', ',', ' ', '\'']
        .into_iter()
        .filter(|&mark| mark != marks.decimal && marks.thousands.is_none())
        .find(|&mark| {
            reads(Marks {
                thousands: Some(mark),
                ..marks
            })
        });
    match (turned, separator) {
        (true, Some(mark)) => {
            return Some(format!(
                "is `{mark}` the decimal mark (`decimal = \"{mark}\"`), or does it stand between thousands (`thousands = \"{mark}\"`)?"
            ));
        }
        (true, None) => {
            return Some(format!(
                "set `decimal = \"{other}\"` if this instrument writes `{other}`"
            ));
        }
        (false, Some(mark)) => {
            return Some(format!(
                "if marks stand between thousands, say so with `thousands = \"{mark}\"`"
            ));
        }
        (false, None) => {}
    }
    let both = [(',', '.'), ('.', ',')]
        .into_iter()
        .find(|&(decimal, mark)| {
            decimal != marks.decimal
                && reads(Marks {
                    decimal,
                    thousands: Some(mark),
                })
        });
    if let Some((decimal, mark)) = both {
        return Some(format!(
            "set `decimal = \"{decimal}\"` and `thousands = \"{mark}\"` if this instrument writes so"
        ));
    }
    (!text.contains(|c: char| c.is_ascii_digit()))
        .then(|| "if it means that nothing was measured, list it in `no_value`".to_owned())
}

#[cfg(test)]
mod tests;
