//! What a characteristic takes of its tolerance, and how sure that is.

use jiff::tz::TimeZone;
use restudy_engine::{PART, Standing};

use super::news::{Item, News};
use super::past::Past;
use super::words::{capital, chance, day, limit, name, percent, percent_against, sentence};
use crate::evidence::Evidence;
use crate::figures::significant;
use crate::record::Record;

/// An upper limit further above the estimate than this helps nobody.
const USEFUL_UPPER: f64 = 1.5;

/// The share, or that there is none.
pub(super) fn share(item: Item<'_>) -> String {
    item.share().map_or_else(
        || "not judged".into(),
        |share| percent_against(share, item.limits()),
    )
}

/// `35 % (was 19 %)`.
pub(super) fn share_and_before(item: Item<'_>) -> String {
    match (item.share_before(), item.earlier) {
        (Some(before), _) => format!("{} (was {})", share(item), percent(before)),
        (None, Some(_)) => format!("{} (was not judged)", share(item)),
        (None, None) => format!("{} (first study)", share(item)),
    }
}

/// The first line of a characteristic that went up: what, its limit, last time.
pub(super) fn what(
    item: Item<'_>,
    record: &Record,
    past: Option<&Past>,
    zone: &TimeZone,
) -> String {
    let mut text = format!(
        "{}{}: the gauge takes {} of the tolerance.",
        capital(&item.label()),
        width(record),
        share(item)
    );
    if let Some((at, _)) = item.limit() {
        text.push_str(&format!(" Limit for {}: {}.", item.now(), limit(at)));
    }
    if record.standing.judged_by.is_some_and(|by| by != "estimate") {
        text.push_str(&format!(" {}.", capital(&sentence(&record.standing.why))));
    }
    text.push_str(&match (item.earlier, item.share_before()) {
        (Some(earlier), Some(before)) => {
            format!(" It was {} on {}.", percent(before), day(earlier.day(zone)))
        }
        (Some(earlier), None) => format!(" It was not judged on {}.", day(earlier.day(zone))),
        (None, _) => " This is its first study.".into(),
    });
    if past.is_some_and(|past| past.other_tolerance(record.lower, record.upper)) {
        text.push_str(" Its limits were other ones then.");
    }
    text
}

/// The tolerance in brackets, where a rule gives it a width.
fn width(record: &Record) -> String {
    let unit = record
        .unit
        .as_deref()
        .map(|u| format!(" {}", name(u)))
        .unwrap_or_default();
    let plain = |x: f64| {
        let text = significant(x, 5);
        if text.contains('.') && !text.contains('e') {
            text.trim_end_matches('0').trim_end_matches('.').to_owned()
        } else {
            text
        }
    };
    let bound = record.upper.or(record.lower).map(plain).unwrap_or_default();
    match (record.study.tolerance_rule, record.lower, record.upper) {
        ("two-sided", Some(lower), Some(upper)) => {
            format!(" ({}{unit} wide)", plain(upper - lower))
        }
        ("from zero", ..) => format!(" (limit {bound}{unit}, counted from zero)"),
        ("width", ..) => format!(" (limit {bound}{unit}, against the width that the plan states)"),
        ("to process mean", ..) => {
            format!(" (limit {bound}{unit}, against the distance from the process mean)")
        }
        ("to study mean", ..) => {
            format!(" (limit {bound}{unit}, against the distance from the study's mean)")
        }
        _ => String::new(),
    }
}

/// How sure it is that the true share is above its limit, and above what it is for sure.
pub(super) fn above(item: Item<'_>, record: &Record, evidence: &Evidence) -> String {
    let figure = &record.study.figures.gauge.share_of_tolerance;
    let confidence = percent(record.study.confidence);
    let mut parts = Vec::new();
    if let Some((at, Some(p))) = item.limit() {
        parts.push(format!(
            "confidence {} that the true share is above {}",
            chance(p),
            limit(at)
        ));
    }
    if let Some(least) = figure.at_least.filter(|least| *least >= 0.005) {
        parts.push(format!("{confidence} that it is above {}", percent(least)));
    }
    if parts.is_empty() {
        return format!(
            "the data do not tell{}",
            figure
                .why
                .as_ref()
                .map(|w| format!(": {w}"))
                .unwrap_or_default()
        );
    }
    let times = |upper: f64| figure.estimate.map_or(f64::INFINITY, |e| upper / e);
    let end = match figure.upper {
        Some(upper) if times(upper) < 1.0 => {
            "The estimate lies above its upper limit: components below zero count as zero in it"
                .into()
        }
        Some(upper) if upper <= 1.0 && times(upper) <= USEFUL_UPPER => {
            format!("Two-sided, {confidence}: at most {}", percent(upper))
        }
        _ => few(evidence),
    };
    format!("{}. {end}.", parts.join(", "))
}

/// Why there is no useful upper end: the factor with the fewest levels.
fn few(evidence: &Evidence) -> String {
    let others = evidence
        .factors
        .iter()
        .filter(|f| f.name != PART && f.levels.len() > 1);
    match others.min_by_key(|f| f.levels.len()) {
        Some(factor) => format!(
            "{} {}s give no useful upper end",
            capital(&number(factor.levels.len())),
            name(&factor.word)
        ),
        None => "This design gives no useful upper end".into(),
    }
}

fn number(n: usize) -> String {
    let words = [
        "two", "three", "four", "five", "six", "seven", "eight", "nine",
    ];
    n.checked_sub(2)
        .and_then(|i| words.get(i))
        .map_or_else(|| n.to_string(), |word| (*word).to_owned())
}

/// The first line of a characteristic that came back.
pub(super) fn back(item: Item<'_>) -> String {
    let (label, now) = (capital(&item.label()), item.now());
    match (item.before(), item.limits(), item.share()) {
        (Some(before @ (Standing::Act | Standing::Watch)), Some(limits), Some(_)) => {
            let held = if before == Standing::Act {
                limits.act
            } else {
                limits.watch
            };
            format!(
                "{label} has left \"{before}\": {}, below the {} needed to come back ({} × {}). Now \"{now}\".",
                share_and_before(item),
                limit(limits.back_below * held),
                limits.back_below,
                limit(held),
            )
        }
        _ => format!(
            "{label} is judged again: {} of the tolerance. Now \"{now}\".",
            share(item)
        ),
    }
}

/// How sure it is that the true share is below the limit it came back under.
pub(super) fn below(item: Item<'_>) -> Option<String> {
    let (at, p) = item.limit()?;
    Some(format!(
        "confidence {} that the true share is below {}",
        chance(1.0 - p?),
        limit(at)
    ))
}

/// Why a standing is held although the share is not above its limit.
pub(super) fn held(item: Item<'_>) -> Option<String> {
    let (limits, share_now) = (item.limits()?, item.share()?);
    let at = match item.news {
        News::StillAct => limits.act,
        News::StillWatch => limits.watch,
        _ => return None,
    };
    (share_now <= at).then(|| {
        format!(
            "{} is at {}: under {}, not yet under {}, so it stays at {}",
            item.label(),
            share(item),
            limit(at),
            limit(limits.back_below * at),
            item.now()
        )
    })
}
