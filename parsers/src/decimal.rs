//! Exact sums and quotients of decimal texts, ASCII with a point. `None` always means: does not fit 37 digits.

/// Digits that an exact decimal sum or product may hold; `i128` has 38.
const EXACT_DIGITS: usize = 37;
/// Digits to which a quotient without an end is worked out; `f64` holds 17.
const QUOTIENT_DIGITS: u32 = 25;

/// Mantissa and power of ten.
pub(crate) fn parts(written: &str) -> Option<(i128, i32)> {
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
pub(crate) fn exact_quotient(mut digits: i128, mut power: i32, under: i128) -> Option<String> {
    let enough = 10_i128.pow(QUOTIENT_DIGITS).checked_mul(under)?;
    while digits % under != 0 && digits.abs() < enough {
        digits = digits.checked_mul(10)?;
        power = power.checked_sub(1)?;
    }
    Some(format!("{}e{power}", digits / under))
}

/// The number nearest to the exact sum; `None` when it does not fit.
pub(crate) fn exact_sum(a: &str, b: &str) -> Option<f64> {
    let (a, a_power) = parts(a)?;
    let (b, b_power) = parts(b)?;
    let power = a_power.min(b_power);
    let scaled = |digits: i128, from: i32| {
        digits.checked_mul(10_i128.checked_pow(u32::try_from(from.checked_sub(power)?).ok()?)?)
    };
    let sum = scaled(a, a_power)?.checked_add(scaled(b, b_power)?)?;
    format!("{sum}e{power}").parse().ok()
}
