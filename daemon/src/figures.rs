//! Numbers for people: no more digits than they are worth.

/// `x` with so many significant digits, in plain notation where that stays readable.
#[must_use]
pub fn significant(x: f64, digits: usize) -> String {
    if x == 0.0 || !x.is_finite() {
        return "0".into();
    }
    let digits = digits.max(1);
    let scientific = format!("{x:.*e}", digits - 1);
    let exponent: i32 = scientific
        .split_once('e')
        .and_then(|(_, e)| e.parse().ok())
        .unwrap_or(0);
    match exponent {
        -5..=5 => {
            let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
            format!("{x:.decimals$}")
        }
        _ => scientific,
    }
}

#[cfg(test)]
mod tests {
    use super::significant;

    #[test]
    fn digits_follow_the_size() {
        for (x, text) in [
            (0.0012345, "0.00123"),
            (12.345, "12.3"),
            (1234.5, "1234"),
            (9.999, "10.0"),
            (0.0, "0"),
            (-0.5, "-0.500"),
            (1.5e-9, "1.50e-9"),
        ] {
            assert_eq!(significant(x, 3), text, "{x}");
        }
    }
}
