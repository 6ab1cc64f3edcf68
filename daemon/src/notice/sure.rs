//! What a characteristic takes of its tolerance, and how sure that is.

use jiff::tz::TimeZone;
use restudy_engine::{Judge, Standing};

use super::judged;
use super::news::{Item, News};
use super::past::Past;
use super::words::{
    at_least, at_most, capital, chance, limit, name, percent, percent_against, sentence,
};
use crate::evidence::Evidence;
use crate::figures::significant;
use crate::plain::dates::day;
use crate::plain::{UpperEnd, held as held_limit};
use crate::record::Record;

/// A lower limit below this is not worth a word.
pub(super) const SAID_FROM: f64 = 0.01;

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
    let confidence = limit(record.study.confidence);
    let mut parts = Vec::new();
    if let Some((at, Some(p))) = item.limit() {
        parts.push(format!(
            "confidence {} that the true share is above {}",
            chance(p),
            limit(at)
        ));
    }
    if let Some(least) = figure.at_least.filter(|least| *least >= SAID_FROM) {
        parts.push(format!("{confidence} that it is above {}", at_least(least)));
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
    let end = UpperEnd::of(&record.study, &evidence.factors).sentence(&confidence, at_most);
    format!("{}. {}.", parts.join(", "), sentence(&end))
}

/// The first line of a characteristic that came back.
pub(super) fn back(item: Item<'_>, judge: Judge) -> String {
    let (label, now) = (capital(&item.label()), item.now());
    let before = item.before();
    match (before, item.limits(), judged::of(item, judge)) {
        (Some(before @ (Standing::Act | Standing::Watch)), Some(limits), Some(judged)) => {
            let held = if before == Standing::Act {
                limits.act
            } else {
                limits.watch
            };
            let needed = format!(
                "below the {} needed to come back ({} × {})",
                limit(limits.back_below * held),
                limits.back_below,
                limit(held)
            );
            match judged.name {
                None => format!(
                    "{label} has left \"{before}\": {}, {needed}. Now \"{now}\".",
                    share_and_before(item)
                ),
                Some(name) => format!(
                    "{label} has left \"{before}\": {name} is {}, {needed}. The estimate is {}. Now \"{now}\".",
                    judged.value,
                    share_and_before(item)
                ),
            }
        }
        _ => {
            let rule = match judge {
                Judge::Estimate => String::new(),
                _ => format!(" {}.", capital(&sentence(item.why()))),
            };
            format!(
                "{label} is judged again: {} of the tolerance.{rule} Now \"{now}\".",
                share(item)
            )
        }
    }
}

/// How sure it is on which side of the limit that it came back under the true share lies.
pub(super) fn below(item: Item<'_>) -> Option<String> {
    let (at, p) = item.limit()?;
    let above = p?;
    let (p, side) = if above > 0.5 {
        (above, "still above")
    } else {
        (1.0 - above, "below")
    };
    Some(format!(
        "confidence {} that the true share is {side} {}",
        chance(p),
        limit(at)
    ))
}

/// Why a standing is held although the judged figure is not above its limit.
pub(super) fn held(item: Item<'_>, judge: Judge) -> Option<String> {
    let (limits, judged) = (item.limits()?, judged::of(item, judge)?);
    if !matches!(item.news, News::StillAct | News::StillWatch) {
        return None;
    }
    let at = held_limit(item.now(), Some(judged.share), limits)?;
    let is_at = match judged.name {
        None => format!("is at {}", judged.value),
        Some(name) => format!("is held: {name} is {}", judged.value),
    };
    Some(format!(
        "{} {is_at}: under {}, not yet under {}, so it stays at {}",
        item.label(),
        limit(at),
        limit(limits.back_below * at),
        item.now()
    ))
}
