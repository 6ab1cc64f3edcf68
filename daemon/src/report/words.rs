//! Numbers and lists as a reader sees them: rounded to what a study can support.

use crate::plain::{Rounded, percent_as_set};

/// A blank that keeps a number and its unit on one line.
pub(super) const NBSP: char = '\u{a0}';
/// Shares above this are not told apart.
const SHARE_MAX: f64 = 99.99;
/// A p below this is not told apart from a smaller one.
const P_MIN: f64 = 0.001;

/// A share in whole percent.
pub(super) fn percent(share: f64) -> String {
    if share > SHARE_MAX {
        return format!("over 9999{NBSP}%");
    }
    if share > 0.0 && share < 0.005 {
        return format!("under 1{NBSP}%");
    }
    format!("{:.0}{NBSP}%", 100.0 * share)
}

/// A share in whole percent, with as many decimals more as show on which side of each limit it lies.
pub(super) fn percent_beside(share: f64, limits: &[f64]) -> String {
    let limits: Vec<f64> = limits.iter().map(|limit| 100.0 * limit).collect();
    let text = Rounded::Nearest.beside(100.0 * share, &limits, 0);
    if text.contains('.') && share <= SHARE_MAX {
        format!("{text}{NBSP}%")
    } else {
        percent(share)
    }
}

/// A lower limit of a share in whole percent.
pub(super) fn at_least(share: f64) -> String {
    if share > SHARE_MAX {
        return percent(share);
    }
    format!("{}{NBSP}%", Rounded::Down.beside(100.0 * share, &[], 0))
}

/// An upper limit of a share in whole percent; never as much as the whole tolerance.
pub(super) fn at_most(share: f64) -> String {
    format!("{}{NBSP}%", Rounded::Up.beside(100.0 * share, &[100.0], 0))
}

/// A p, never rounded to nothing, and on its side of the one above which the plan pools.
pub(super) fn p_value(p: f64, pool_above: Option<f64>) -> String {
    let limits: Vec<f64> = pool_above.into_iter().collect();
    match p {
        p if p < P_MIN => format!("p < {P_MIN}"),
        p if p > 1.0 - P_MIN => format!("p > {}", 1.0 - P_MIN),
        p if p < 0.1 => format!("p = {}", Rounded::Nearest.beside(p, &limits, 3)),
        p => format!("p = {}", Rounded::Nearest.beside(p, &limits, 2)),
    }
}

/// A limit on a share, or a confidence, as it was set.
pub(super) fn limit(share: f64) -> String {
    format!("{}{NBSP}%", percent_as_set(share))
}

/// A chance to the nearest 5 %.
pub(super) fn chance(p: f64) -> String {
    match (20.0 * p).round() {
        n if n < 1.0 => format!("under 5{NBSP}%"),
        n if n > 19.0 => format!("over 95{NBSP}%"),
        n => format!("{:.0}{NBSP}%", 5.0 * n),
    }
}

/// Three significant digits.
pub(super) fn three_digits(x: f64) -> String {
    digits(x, 3)
}

/// At most four significant digits, no trailing zeros.
pub(super) fn short(x: f64) -> String {
    let text = digits(x, 4);
    if text.contains('e') {
        text
    } else {
        trimmed(&text).to_owned()
    }
}

/// A number as it was written, with a true minus sign.
pub(super) fn exact(x: f64) -> String {
    if x != 0.0 && !(1e-6..1e9).contains(&x.abs()) {
        minus(&format!("{x:e}"))
    } else {
        minus(&x.to_string())
    }
}

/// `a, b and c`.
pub(super) fn list(words: &[String]) -> String {
    match words {
        [] => String::new(),
        [only] => only.clone(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

/// `1 part`, `10 parts`.
pub(super) fn count(n: usize, noun: &str) -> String {
    if n == 1 {
        format!("1{NBSP}{noun}")
    } else {
        format!("{n}{NBSP}{noun}s")
    }
}

/// A text cut to a number of letters for a place that cannot wrap.
pub(super) fn cut(text: &str, letters: usize) -> String {
    if text.chars().count() <= letters {
        return text.to_owned();
    }
    let head: String = text.chars().take(letters.saturating_sub(1)).collect();
    format!("{}…", head.trim_end())
}

/// A sentence begins with a capital.
pub(super) fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(letters).collect()
    })
}

fn digits(x: f64, significant: usize) -> String {
    if x == 0.0 {
        return "0".to_owned();
    }
    let scientific = format!("{x:.*e}", significant - 1);
    let power: i32 = scientific
        .split_once('e')
        .and_then(|(_, power)| power.parse().ok())
        .unwrap_or(0);
    if !(-4..6).contains(&power) {
        return minus(&scientific);
    }
    let decimals = usize::try_from(significant as i32 - 1 - power).unwrap_or(0);
    minus(&format!("{x:.decimals$}"))
}

fn minus(text: &str) -> String {
    text.replace('-', "−")
}

fn trimmed(text: &str) -> &str {
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.')
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plain(text: &str) -> String {
        text.replace(NBSP, " ")
    }

    #[test]
    fn shares_are_whole_percents_unless_a_limit_is_near() {
        let beside = |share| plain(&percent_beside(share, &[0.10, 0.30]));
        assert_eq!(plain(&percent(0.346)), "35 %");
        assert_eq!(plain(&percent(0.001)), "under 1 %");
        assert_eq!(plain(&percent(1e200)), "over 9999 %");
        assert_eq!(beside(0.346), "35 %");
        assert_eq!(beside(0.304), "30.4 %");
        assert_eq!(beside(0.2996), "29.96 %");
        assert_eq!(beside(0.30), "30 %");
        assert_eq!(plain(&limit(0.125)), "12.5 %");
        assert_eq!(plain(&limit(0.3)), "30 %");
    }

    #[test]
    fn chances_are_rounded_to_five_percent() {
        let words = [0.0, 0.02, 0.03, 0.79, 0.96, 0.98, 1.0].map(|p| plain(&chance(p)));
        assert_eq!(
            words,
            [
                "under 5 %",
                "under 5 %",
                "5 %",
                "80 %",
                "95 %",
                "over 95 %",
                "over 95 %"
            ]
        );
    }

    #[test]
    fn limits_of_a_share_claim_no_more_than_they_have() {
        assert_eq!(plain(&at_least(0.317)), "31 %");
        assert_eq!(plain(&at_most(0.552)), "56 %");
        assert_eq!(plain(&at_most(0.996)), "99.6 %");
        assert_eq!(plain(&limit(0.975)), "97.5 %");
    }

    #[test]
    fn a_p_is_never_nothing() {
        let table = [
            (1e-9, None, "p < 0.001"),
            (0.0123, None, "p = 0.012"),
            (0.254, None, "p = 0.25"),
            (0.254, Some(0.25), "p = 0.254"),
            (1.0, None, "p > 0.999"),
        ];
        for (p, pool_above, text) in table {
            assert_eq!(p_value(p, pool_above), text);
        }
    }

    #[test]
    fn numbers_keep_three_digits() {
        let table = [
            (0.0, "0"),
            (1.5678, "1.57"),
            (0.99996, "1.00"),
            (-12.34, "−12.3"),
            (123_456.0, "123456"),
            (1.234e-7, "1.23e−7"),
            (4.2e140, "4.20e140"),
        ];
        for (x, text) in table {
            assert_eq!(three_digits(x), text);
        }
        assert_eq!(short(-49.999_999_999), "−50");
        assert_eq!(short(12.5), "12.5");
        assert_eq!(short(100.0), "100");
    }

    #[test]
    fn lists_counts_and_cuts() {
        let names = ["KL", "MO", "TS"].map(str::to_owned);
        assert_eq!(list(&names), "KL, MO and TS");
        assert_eq!(
            (plain(&count(1, "part")), plain(&count(10, "part"))),
            ("1 part".into(), "10 parts".into())
        );
        assert_eq!(cut("loading", 7), "loading");
        assert_eq!(cut("loading bay", 8), "loading…");
    }
}
