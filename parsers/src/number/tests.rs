//! The grammar, its hints and its exact sums.

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
