//! The grammar of numbers: a sign, digits with at most one decimal mark, an exponent; between groups of
//! three digits a mark for thousands, when the rule states one; a unit behind them, when it is asked for.
//!
//! Not here: what a unit means, spelled numbers, infinities. A text that could be two numbers is no
//! number.
//!
//! Invariant: a [`Number`] is finite, and is zero only when its text says zero.

use crate::names::shorten;
use crate::unit::SEXAGESIMAL;

/// Digits that an exact decimal sum or product may hold; `i128` has 38.
const EXACT_DIGITS: usize = 37;
/// Digits to which a quotient without an end is worked out; `f64` holds 17.
const QUOTIENT_DIGITS: u32 = 25;
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

    fn parse(text: &str, written: String) -> Result<Self, NotANumber> {
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
            let (digits, power) = decimal(&self.written)?;
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

fn take_sign(rest: &mut &str) -> &'static str {
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
fn scan(text: &str, marks: Marks) -> Option<(String, &str)> {
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

/// Degrees from degrees, minutes and perhaps seconds: `None` when the text is no such angle,
/// `Some(None)` when it is one that cannot be.
#[allow(clippy::option_option)]
fn sexagesimal(text: &str, marks: Marks) -> Option<Option<Number>> {
    SEXAGESIMAL[0]
        .iter()
        .find_map(|mark| text.split_once(mark))
        .filter(|(before, after)| {
            before.contains(|c: char| c.is_ascii_digit())
                && after.contains(|c: char| c.is_ascii_digit())
        })?;
    Some(seconds(text, marks).and_then(|number| number.times(1, 3600)))
}

/// Seconds of arc of an angle written in two or three steps.
fn seconds(text: &str, marks: Marks) -> Option<Number> {
    let mut rest = text;
    let sign = take_sign(&mut rest);
    let mut total: (i128, i32) = (0, 0);
    let mut is_last = false;
    for (step, names) in SEXAGESIMAL.iter().enumerate() {
        if rest.is_empty() && step == 2 {
            break;
        }
        let (written, after) = scan(
            rest,
            Marks {
                thousands: None,
                ..marks
            },
        )?;
        let starts = rest.starts_with(|c: char| c.is_ascii_digit());
        if is_last || !starts || written.contains('e') {
            return None;
        }
        is_last = written.contains('.');
        let after = after.trim_start();
        let longest = names.iter().filter(|name| after.starts_with(**name));
        let name = longest.max_by_key(|name| name.len())?;
        rest = after[name.len()..].trim_start();
        let (digits, power) = decimal(&written)?;
        let number: f64 = written.parse().ok()?;
        if step > 0 && number >= 60.0 {
            return None;
        }
        let weight = [3600, 60, 1][step];
        let digits = digits.checked_mul(weight)?;
        total = (
            total
                .0
                .checked_mul(10_i128.checked_pow(u32::try_from(-power).ok()?)?)?
                .checked_add(digits)?,
            power,
        );
    }
    if !rest.is_empty() {
        return None;
    }
    let written = format!("{sign}{}e{}", total.0, total.1);
    Number::parse(text, written).ok()
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

/// `digits × 10^power / under`, to its end or to at least 25 digits.
fn exact_quotient(mut digits: i128, mut power: i32, under: i128) -> Option<String> {
    let enough = 10_i128.pow(QUOTIENT_DIGITS).checked_mul(under)?;
    while digits % under != 0 && digits.abs() < enough {
        digits = digits.checked_mul(10)?;
        power = power.checked_sub(1)?;
    }
    Some(format!("{}e{power}", digits / under))
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

    fn marks(decimal: char) -> Marks {
        Marks {
            decimal,
            thousands: None,
        }
    }

    fn read(text: &str, mark: char) -> Result<Number, NotANumber> {
        Number::read(text, marks(mark))
    }

    fn of(value: f64) -> Number {
        Number::of(value).unwrap()
    }

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
            assert_eq!(read(text, mark).map(|n| n.value), Ok(value), "{text}");
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
            assert!(read(text, mark).is_err(), "{text}");
        }
    }

    fn grouped(text: &str, decimal: char, thousands: char) -> Option<f64> {
        let marks = Marks::new(decimal, Some(thousands)).unwrap();
        Number::read(text, marks).ok().map(|number| number.value)
    }

    #[test]
    fn thousands_are_read_where_they_are_stated_and_in_threes() {
        for (text, decimal, thousands, value) in [
            ("1.234", ',', '.', 1234.0),
            ("1.234.567,25", ',', '.', 1_234_567.25),
            ("-12.345,5", ',', '.', -12345.5),
            ("1234,5", ',', '.', 1234.5),
            ("1,234.5e-3", '.', ',', 1.2345),
            ("1 234,5", ',', ' ', 1234.5),
            ("1\u{a0}234\u{a0}567", ',', ' ', 1_234_567.0),
            ("1\u{202f}234,5", ',', '\u{a0}', 1234.5),
            ("1'234.5", '.', '\'', 1234.5),
            ("1\u{2019}234.5", '.', '\'', 1234.5),
            ("0,125", ',', '.', 0.125),
        ] {
            assert_eq!(grouped(text, decimal, thousands), Some(value), "{text}");
        }
        for (text, decimal, thousands) in [
            ("1.23", ',', '.'),
            ("1.2345", ',', '.'),
            ("12345.678", ',', '.'),
            ("1234.567", ',', '.'),
            ("0.345", ',', '.'),
            ("1..234", ',', '.'),
            (".234", ',', '.'),
            ("1.234.5", ',', '.'),
            ("1,234.5678,5", '.', ','),
            ("1.5,234", '.', ','),
            ("1,234,567", ',', '.'),
            ("1 23", ',', ' '),
            ("1  234", ',', ' '),
            ("1 234", ',', '\''),
        ] {
            assert_eq!(grouped(text, decimal, thousands), None, "{text}");
        }
    }

    #[test]
    fn marks_that_cannot_be() {
        for (decimal, thousands) in [
            (';', None),
            ('.', Some('.')),
            (',', Some(';')),
            ('.', Some('5')),
        ] {
            assert!(Marks::new(decimal, thousands).is_err());
        }
    }

    #[test]
    fn the_hint_fits_the_mistake() {
        let hint = |text, mark| {
            Quantity::read(text, marks(mark))
                .unwrap_err()
                .hint
                .unwrap_or_default()
        };
        assert!(hint("50.012", ',').contains("decimal = \".\""));
        assert!(hint("1.234,5", ',').contains("thousands"));
        assert!(hint("1\u{202f}234,5", ',').contains("thousands"));
        assert!(hint("1.234,5", '.').contains("`thousands = \".\"`"));
        assert!(hint("1.234", ',').contains("or does it stand between thousands"));
        assert!(hint("12,5", '.').contains("decimal = \",\""));
        assert!(hint("1.234,5 mm", ',').contains("thousands"));
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
            let read = |text| read(text, '.').unwrap();
            assert_eq!(read(a).plus(&read(b)), Some(sum), "{a} + {b}");
        }
        assert_eq!(of(f64::MAX).plus(&of(f64::MAX)), None);
        assert_eq!(of(0.1).plus(&of(0.2)), Some(0.3));
    }
}
