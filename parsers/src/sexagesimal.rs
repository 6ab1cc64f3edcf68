//! Angles in degrees, minutes and perhaps seconds of arc: `12°30'15"`, `-0° 30'`, `45°7.5'`. Only the last
//! step has a fraction; minutes and seconds are less than 60.

use crate::decimal::parts;
use crate::number::{Marks, Number, scan, take_sign};

/// The marks behind degrees, minutes and seconds in one number.
const MARKS: [&[&str]; 3] = [
    &["°", "\u{ba}"],
    &["'", "\u{2032}", "\u{2019}"],
    &["\"", "''", "\u{2033}", "\u{201d}", "\u{2019}\u{2019}"],
];

/// Degrees from degrees, minutes and perhaps seconds: `None` when the text is no such angle,
/// `Some(None)` when it is one that cannot be.
#[allow(clippy::option_option)]
pub(crate) fn sexagesimal(text: &str, marks: Marks) -> Option<Option<Number>> {
    MARKS[0]
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
    for (step, names) in MARKS.iter().enumerate() {
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
        let (digits, power) = parts(&written)?;
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
