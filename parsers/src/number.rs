//! The grammar of numbers: a sign, digits with at most one decimal mark, an exponent.
//!
//! Not here: grouping marks, unit suffixes, spelled numbers, infinities. A text that could be two
//! numbers is no number.
//!
//! Invariant: a [`Number`] is finite, and is zero only when its text says zero.

use crate::names::shorten;

/// Digits that an exact decimal sum may hold; `i128` has 38.
const EXACT_DIGITS: usize = 37;

/// A number and the decimal text it was written as.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Number {
    pub(crate) value: f64,
    /// ASCII, with a point.
    written: String,
}

/// Why a text is no number.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct NotANumber {
    pub(crate) wrong: String,
    pub(crate) hint: Option<String>,
}

impl Number {
    /// A finite number of a workbook, taken as the shortest decimal text that means it.
    pub(crate) fn of(value: f64) -> Self {
        Self {
            value,
            written: value.to_string(),
        }
    }

    /// The number that `text` writes with `mark` as its decimal mark. Blanks around it are cut.
    pub(crate) fn read(text: &str, mark: char) -> Result<Self, NotANumber> {
        let text = text.trim();
        let Some(written) = plain(text, mark) else {
            return Err(NotANumber {
                wrong: format!(
                    "`{}` is not a number; this instrument's decimal mark is `{mark}`",
                    shorten(text)
                ),
                hint: hint(text, mark),
            });
        };
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
}

/// The text with a point for its mark and a hyphen for its minus, if it is a number's.
fn plain(text: &str, mark: char) -> Option<String> {
    let mut written = String::with_capacity(text.len());
    let mut chars = text.chars().peekable();
    let digits = |written: &mut String, chars: &mut std::iter::Peekable<std::str::Chars<'_>>| {
        let before = written.len();
        while let Some(digit) = chars.next_if(char::is_ascii_digit) {
            written.push(digit);
        }
        written.len() > before
    };
    if let Some(sign) = chars.next_if(|c| matches!(c, '+' | '-' | '\u{2212}'))
        && sign != '+'
    {
        written.push('-');
    }
    let whole = digits(&mut written, &mut chars);
    if chars.next_if_eq(&mark).is_some() {
        if !whole {
            written.push('0');
        }
        written.push('.');
        if !digits(&mut written, &mut chars) {
            return None;
        }
    } else if !whole {
        return None;
    }
    if chars.next_if(|c| matches!(c, 'e' | 'E')).is_some() {
        written.push('e');
        if let Some(sign) = chars.next_if(|c| matches!(c, '+' | '-' | '\u{2212}'))
            && sign != '+'
        {
            written.push('-');
        }
        if !digits(&mut written, &mut chars) {
            return None;
        }
    }
    chars.next().is_none().then_some(written)
}

fn zero(written: &str) -> bool {
    let mantissa = written.split('e').next().unwrap_or(written);
    !mantissa.bytes().any(|b| (b'1'..=b'9').contains(&b))
}

fn hint(text: &str, mark: char) -> Option<String> {
    let other = if mark == ',' { '.' } else { ',' };
    if plain(text, other).is_some() {
        return Some(format!(
            "set `decimal = \"{other}\"` if this instrument writes `{other}`"
        ));
    }
    let grouped = |c: char| matches!(c, '.' | ',' | '\'' | '\u{2019}' | '_') || c.is_whitespace();
    let ungrouped: String = text.chars().filter(|&c| c == mark || !grouped(c)).collect();
    if ungrouped.len() < text.len() && plain(&ungrouped, mark).is_some() {
        return Some("have the numbers written without marks between thousands".to_owned());
    }
    if !text.contains(|c: char| c.is_ascii_digit()) {
        return Some("if it means that nothing was measured, list it in `no_value`".to_owned());
    }
    let (number, suffix) = text.split_at(text.find(|c: char| {
        !(c.is_ascii_digit() || grouped(c) || matches!(c, '+' | '-' | '\u{2212}'))
    })?);
    (plain(number.trim_end(), mark).is_some()).then(|| {
        format!(
            "`{}` looks like a unit: have it left out, or take the number alone with `find`",
            shorten(suffix)
        )
    })
}

/// Mantissa and power of ten.
fn decimal(written: &str) -> Option<(i128, i32)> {
    let (mantissa, exponent) = written.split_once('e').unwrap_or((written, "0"));
    let exponent: i32 = exponent.parse().ok()?;
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let fraction = fraction.trim_end_matches('0');
    if whole.len() + fraction.len() > EXACT_DIGITS {
        return None;
    }
    let digits: i128 = format!("{whole}{fraction}").parse().ok()?;
    Some((
        digits,
        exponent.checked_sub(i32::try_from(fraction.len()).ok()?)?,
    ))
}

fn exact_sum(a: &str, b: &str) -> Option<f64> {
    let (a, a_power) = decimal(a)?;
    let (b, b_power) = decimal(b)?;
    let power = a_power.min(b_power);
    let scaled = |digits: i128, from: i32| {
        digits.checked_mul(10_i128.checked_pow(u32::try_from(from.checked_sub(power)?).ok()?)?)
    };
    let sum = scaled(a, a_power)?.checked_add(scaled(b, b_power)?)?;
    format!("{sum}e{power}").parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Expected values are Rust literals: the compiler's own correctly rounded reading.
    #[test]
    fn texts_that_are_numbers() {
        for (text, mark, value) in [
            ("50.012", '.', 50.012),
            ("50,012", ',', 50.012),
            ("  -0.5 ", '.', -0.5),
            ("+12", '.', 12.0),
            ("\u{2212}3,25", ',', -3.25),
            (".5", '.', 0.5),
            ("-,5", ',', -0.5),
            ("1e3", '.', 1000.0),
            ("1,5E-3", ',', 0.0015),
            ("1.5e\u{2212}3", '.', 0.0015),
            ("007", '.', 7.0),
            ("0.000", '.', 0.0),
            ("0e-999", '.', 0.0),
            (
                "12.034500000000000000000000000000000000000000001",
                '.',
                12.0345,
            ),
            ("1.7976931348623157e308", '.', f64::MAX),
        ] {
            assert_eq!(
                Number::read(text, mark).map(|n| n.value),
                Ok(value),
                "{text}"
            );
        }
    }

    #[test]
    fn texts_that_are_not() {
        for (text, mark) in [
            ("", '.'),
            ("-", '.'),
            (".", '.'),
            ("5.", '.'),
            ("e5", '.'),
            ("1e", '.'),
            ("1e+", '.'),
            ("12.03.4", '.'),
            ("50.012", ','),
            ("50,012", '.'),
            ("1.234,5", ','),
            ("1,234.5", '.'),
            ("1 234", '.'),
            ("1\u{a0}234", '.'),
            ("1'234", '.'),
            ("12.0034 mm", '.'),
            ("NaN", '.'),
            ("inf", '.'),
            ("infinity", '.'),
            ("0x1F", '.'),
            ("1e999", '.'),
            ("1e-400", '.'),
            ("--5", '.'),
            ("5-", '.'),
            ("\u{663}", '.'),
            ("1_000", '.'),
        ] {
            assert!(Number::read(text, mark).is_err(), "{text}");
        }
    }

    #[test]
    fn the_hint_fits_the_mistake() {
        let hint = |text, mark| {
            Number::read(text, mark)
                .unwrap_err()
                .hint
                .unwrap_or_default()
        };
        assert!(hint("50.012", ',').contains("decimal = \".\""));
        assert!(hint("1.234,5", ',').contains("thousands"));
        assert!(hint("1\u{202f}234,5", ',').contains("thousands"));
        assert!(hint("12.0034 mm", '.').contains("`mm` looks like a unit"));
        assert!(hint("12.0034\u{b5}m", '.').contains("unit"));
        assert!(hint("n.c.", '.').contains("`no_value`"));
        assert_eq!(hint("12.03.4", '.'), "");
    }

    /// 50 + 0.05 in floating point is 50.05; 1.1 + 2.2 and 0.1 + 0.2 are the textbook cases that are not.
    #[test]
    fn a_sum_is_the_nearest_number_to_the_exact_decimal_sum() {
        for (a, b, sum) in [
            ("50", "0.05", 50.05),
            ("50", "-0.05", 49.95),
            ("0.1", "0.2", 0.3),
            ("1.1", "2.2", 3.3),
            ("12.345678901234567", "1e-3", 12.346678901234567),
            ("25.4", "0.0005", 25.4005),
            ("1e20", "1e-3", 1e20),
            ("1e300", "1", 1e300),
            ("0", "0.1", 0.1),
            ("-0.3", "0.1", -0.2),
        ] {
            let read = |text| Number::read(text, '.').unwrap();
            assert_eq!(read(a).plus(&read(b)), Some(sum), "{a} + {b}");
        }
        assert_eq!(Number::of(f64::MAX).plus(&Number::of(f64::MAX)), None);
        assert_eq!(Number::of(0.1).plus(&Number::of(0.2)), Some(0.3));
    }
}
