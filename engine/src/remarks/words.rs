//! Numbers, names and lists as people write them.

/// So many significant digits, without an exponent where that is readable.
pub(super) fn rounded(digits: i32, x: f64) -> String {
    let magnitude = if x == 0.0 {
        0
    } else {
        let scientific = format!("{:.*e}", (digits - 1).max(0) as usize, x);
        scientific
            .rsplit_once('e')
            .and_then(|(_, power)| power.parse().ok())
            .unwrap_or(0)
    };
    if (-5..7).contains(&magnitude) {
        format!("{:.*}", (digits - 1 - magnitude).max(0) as usize, x)
    } else {
        format!("{:.*e}", (digits - 1).max(0) as usize, x)
    }
}

/// Three significant digits.
pub(super) fn number(x: f64) -> String {
    rounded(3, x)
}

/// A fraction in whole percent, below ten in tenths.
pub(super) fn percent(x: f64) -> String {
    if x.abs() < 0.0995 {
        format!("{:.1} %", 100.0 * x)
    } else {
        format!("{:.0} %", 100.0 * x)
    }
}

/// `KL`, `KL and MO`, `KL, MO and TS`.
pub(super) fn list(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [most @ .., last] => format!("{} and {last}", most.join(", ")),
    }
}

/// A stretch of time in the unit that suits it.
pub(super) fn duration(seconds: f64) -> String {
    let (amount, unit) = if seconds < 120.0 {
        (seconds, "s")
    } else if seconds < 7200.0 {
        (seconds / 60.0, "min")
    } else if seconds < 172_800.0 {
        (seconds / 3600.0, "h")
    } else {
        (seconds / 86_400.0, "days")
    };
    format!("{} {unit}", rounded(2, amount))
}
