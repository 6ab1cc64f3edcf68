//! Times with their unit, `"3s"`: a whole number and one of `ms`, `s`, `min`, `h`, `d`, without a blank.

use std::time::Duration;

use crate::walk::Node;

const UNITS: [(&str, u64); 5] = [
    ("ms", 1),
    ("s", 1_000),
    ("min", 60_000),
    ("h", 3_600_000),
    ("d", 86_400_000),
];

/// Other ways in which people write a unit.
const MEANT: [(&str, &[&str]); 4] = [
    ("s", &["sec", "secs", "second", "seconds"]),
    ("min", &["mins", "minute", "minutes"]),
    ("h", &["hr", "hrs", "hour", "hours"]),
    ("d", &["day", "days"]),
];

/// The time at `node`, within bounds that are written the same way.
pub(crate) fn duration(node: &Node<'_>, least: &str, most: &str) -> Option<Duration> {
    let expected =
        format!("a time from \"{least}\" to \"{most}\" with its unit (ms, s, min, h or d)");
    let Some(text) = node.as_text() else {
        node.fault_hint(
            expected,
            "write it in quotes and with its unit, such as \"3s\"",
        );
        return None;
    };
    let within = |time: &Duration| parsed(least) <= Some(*time) && Some(*time) <= parsed(most);
    let time = parsed(text).filter(within);
    if time.is_none() {
        match meant(text) {
            Some(hint) => node.fault_hint(expected, hint),
            None => node.fault(expected),
        }
    }
    time
}

fn parsed(text: &str) -> Option<Duration> {
    let (digits, unit) = split(text);
    let (_, millis) = UNITS.iter().find(|(name, _)| *name == unit)?;
    Some(Duration::from_millis(
        digits.parse::<u64>().ok()?.checked_mul(*millis)?,
    ))
}

fn split(text: &str) -> (&str, &str) {
    let end = text
        .find(|c: char| !c.is_ascii_digit())
        .unwrap_or(text.len());
    text.split_at(end)
}

fn meant(text: &str) -> Option<String> {
    let (digits, rest) = split(text.trim());
    let unit = rest.trim().to_lowercase();
    if digits.is_empty() {
        return None;
    }
    match unit.as_str() {
        "" => return Some(format!("say the unit, such as \"{digits}s\"")),
        "m" => {
            return Some(format!(
                "`m` may be minutes or months: write \"{digits}min\" or days, such as \"30d\""
            ));
        }
        "w" | "week" | "weeks" => return Some("write weeks as days, such as \"7d\"".to_owned()),
        "month" | "months" | "y" | "year" | "years" => {
            return Some("write months and years as days, such as \"90d\"".to_owned());
        }
        _ => {}
    }
    let known = MEANT
        .iter()
        .find(|(_, others)| others.contains(&unit.as_str()))
        .map(|(known, _)| *known);
    let known = known.or_else(|| {
        UNITS
            .iter()
            .map(|(name, _)| *name)
            .find(|name| *name == unit)
    })?;
    let meant = format!("{digits}{known}");
    (meant != text).then(|| format!("write \"{meant}\""))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_spelling_each() {
        for (text, millis) in [
            ("200ms", 200),
            ("3s", 3_000),
            ("5min", 300_000),
            ("2h", 7_200_000),
            ("90d", 7_776_000_000),
        ] {
            assert_eq!(parsed(text), Some(Duration::from_millis(millis)), "{text}");
        }
        for text in [
            "",
            "3",
            "s",
            "3 s",
            "3m",
            "3S",
            "-3s",
            "1.5h",
            "3sec",
            "99999999999999999999s",
            "999999999999999999d",
            "³s",
        ] {
            assert_eq!(parsed(text), None, "{text}");
        }
    }

    #[test]
    fn near_misses_are_answered_with_what_to_write() {
        for (text, hint) in [
            ("5 min", "write \"5min\""),
            ("3 Seconds", "write \"3s\""),
            ("2H", "write \"2h\""),
            ("7", "say the unit, such as \"7s\""),
            (
                "5m",
                "`m` may be minutes or months: write \"5min\" or days, such as \"30d\"",
            ),
            ("2 weeks", "write weeks as days, such as \"7d\""),
        ] {
            assert_eq!(meant(text).as_deref(), Some(hint), "{text}");
        }
        assert_eq!(meant("soon"), None);
        assert_eq!(meant("3s"), None);
    }
}
