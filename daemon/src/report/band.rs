//! The tolerance to scale: its limits with the doubt zone that the gauge makes round each, and the study's parts.
//!
//! Model: a reading closer to a limit than three gauge sds may belong on the other side. Both zones are drawn to the
//! tolerance's own scale, so that their size is the answer. Without a tolerance the gauge's spread lies beside the
//! parts instead.

use maud::{Markup, html};

use super::axis::Axis;
use super::pieces::Strip;
use super::spread::Spread;
use super::subject::Subject;
use super::svg::{self, Side};
use super::unit::Unit;
use super::words::{self, count, exact};

/// Gauge sds from a limit to the end of its doubt zone.
const DOUBT_SDS: f64 = 3.0;
/// Parts further outside than this many widths of what is judged are counted, not drawn.
const OUTSIDE_MAX: f64 = 1.0;
/// Room at each end of the picture, as a part of what it shows.
const MARGIN: f64 = 0.04;
const BAND_TOP: f64 = 22.0;
const BAND_HEIGHT: f64 = 38.0;
const TICKS_TOP: f64 = 66.0;
const TICKS_BOTTOM: f64 = 80.0;
const HEIGHT: f64 = 84.0;

/// The band; `None` when its span is no number.
pub(super) fn band(subject: Subject<'_>, spread: &Spread) -> Option<Strip> {
    let (lower, upper) = (subject.record.lower, subject.record.upper);
    if lower.is_none() && upper.is_none() {
        beside_parts(subject, spread)
    } else {
        tolerance(subject, spread)
    }
}

fn tolerance(subject: Subject<'_>, spread: &Spread) -> Option<Strip> {
    let (lower, upper) = (subject.record.lower, subject.record.upper);
    let doubt = subject.gauge_sd().map(|sd| DOUBT_SDS * sd);
    let zone = doubt.unwrap_or(0.0);
    let means: Vec<f64> = spread.parts.iter().map(|p| p.mean).collect();
    let end = one_sided_end(subject, &means);
    let (from, to) = (lower.or(end)?, upper.or(end)?);
    let room = OUTSIDE_MAX * (to - from).abs().max(zone);
    let drawn = |x: &f64| (from - room..=to + room).contains(x);
    let shown: Vec<f64> = means.iter().copied().filter(drawn).collect();
    let ends = [
        from,
        to,
        lower.map_or(from, |l| l - zone),
        upper.map_or(to, |u| u + zone),
    ];
    let axis = with_margin(ends.into_iter().chain(shown.iter().copied()))?;
    let unit = limit_unit(subject);
    let limits = [(lower, "hatch-down"), (upper, "hatch-up")];
    let body = html! {
        (svg::block(lower.map_or(0.0, |l| axis.at(l)), upper.map_or(100.0, |u| axis.at(u)), BAND_TOP, BAND_HEIGHT, "tolerance"))
        @if let Some(doubt) = doubt {
            @for (limit, hatch) in limits.into_iter().filter_map(|(l, hatch)| Some((l?, hatch))) {
                (svg::block(axis.at(limit - doubt), axis.at(limit + doubt), BAND_TOP, BAND_HEIGHT, &format!("doubt {hatch}")))
            }
        }
        @for limit in [lower, upper].into_iter().flatten() {
            (svg::upright(axis.at(limit), BAND_TOP - 4.0, BAND_TOP + BAND_HEIGHT + 4.0, "limit"))
        }
        (limit_labels(axis, lower, upper, |limit| label(subject, limit, &unit)))
        (part_ticks(axis, &shown))
    };
    let words = [
        tolerance_words(subject),
        doubt_words(subject, doubt),
        part_words(subject, &means, means.len() - shown.len()),
    ];
    let caption = words.into_iter().flatten().collect::<Vec<_>>().join(" ");
    Some(Strip {
        height: HEIGHT,
        body,
        caption,
        aloud: String::new(),
    })
}

/// The gauge's spread beside the parts, where there is no tolerance.
fn beside_parts(subject: Subject<'_>, spread: &Spread) -> Option<Strip> {
    let sd = subject.gauge_sd()?;
    let centre = subject.record.study.grand_mean;
    let half = 0.5 * subject.record.study.spread_sds * sd;
    let means: Vec<f64> = spread.parts.iter().map(|p| p.mean).collect();
    let axis = with_margin(
        [centre - half, centre + half]
            .into_iter()
            .chain(means.iter().copied()),
    )?;
    let unit = subject.unit();
    let size = unit.three_digits(2.0 * half);
    let body = html! {
        (svg::centred(50.0, 14.0, "strong", &size))
        (svg::block(axis.at(centre - half), axis.at(centre + half), BAND_TOP, BAND_HEIGHT, "gauge-spread hatch-up"))
        (part_ticks(axis, &means))
    };
    let caption = format!(
        "Hatched: {} gauge standard deviations, {size}. Ticks: the means of the {}.",
        words::short(subject.record.study.spread_sds),
        count(means.len(), "study part")
    );
    Some(Strip {
        height: HEIGHT,
        body,
        caption,
        aloud: String::new(),
    })
}

/// Where a one-sided tolerance's band ends in the picture: at zero or at the width that its rule gives it, and in
/// any case beyond the parts.
fn one_sided_end(subject: Subject<'_>, means: &[f64]) -> Option<f64> {
    let (limit, inward) = match (subject.record.lower, subject.record.upper) {
        (Some(lower), None) => (lower, 1.0),
        (None, Some(upper)) => (upper, -1.0),
        _ => return None,
    };
    let by_rule = subject.whole().unwrap_or(0.0);
    let furthest = means
        .iter()
        .map(|m| (m - limit) * inward)
        .fold(by_rule, f64::max);
    let depth = if furthest > 0.0 {
        furthest
    } else {
        limit.abs().max(f64::MIN_POSITIVE)
    };
    Some(limit + inward * depth)
}

fn with_margin(values: impl Iterator<Item = f64>) -> Option<Axis> {
    let axis = Axis::over(values)?;
    let margin = MARGIN * (axis.high() - axis.low());
    Axis::over([axis.low() - margin, axis.high() + margin])
}

/// The limits' labels stand inside the tolerance while there is room, else outside.
fn limit_labels(
    axis: Axis,
    lower: Option<f64>,
    upper: Option<f64>,
    label: impl Fn(f64) -> String,
) -> Markup {
    const ROOM: f64 = 45.0;
    let (left, right) = (lower.map(|l| axis.at(l)), upper.map(|u| axis.at(u)));
    let narrow = left
        .zip(right)
        .is_some_and(|(left, right)| right - left < ROOM);
    let sides = if narrow {
        (Side::Left, Side::Right)
    } else {
        (Side::Right, Side::Left)
    };
    html! {
        @if let (Some(x), Some(lower)) = (left, lower) { (svg::beside(x, 14.0, sides.0, "strong", &label(lower))) }
        @if let (Some(x), Some(upper)) = (right, upper) { (svg::beside(x, 14.0, sides.1, "strong", &label(upper))) }
    }
}

fn part_ticks(axis: Axis, means: &[f64]) -> Markup {
    html! { @for mean in means { (svg::upright(axis.at(*mean), TICKS_TOP, TICKS_BOTTOM, "part-tick")) } }
}

/// A limit as a deviation from the nominal of a two-sided tolerance, or else as it is.
fn label(subject: Subject<'_>, limit: f64, unit: &Unit) -> String {
    match from_nominal(subject) {
        Some(nominal) if limit > nominal => format!("+{}", unit.short(limit - nominal)),
        Some(nominal) => unit.short(limit - nominal),
        None => unit.short(limit),
    }
}

fn from_nominal(subject: Subject<'_>) -> Option<f64> {
    subject.record.nominal.filter(|_| subject.width().is_some())
}

fn limit_unit(subject: Subject<'_>) -> Unit {
    let origin = from_nominal(subject).unwrap_or(0.0);
    let limits = [subject.record.lower, subject.record.upper]
        .into_iter()
        .flatten();
    let size = limits.map(|l| (l - origin).abs()).fold(0.0, f64::max);
    // A half of a millimetre either side is still read in µm by those who set it.
    Unit::for_size(subject.record.unit.as_deref(), size / 5.0)
}

fn tolerance_words(subject: Subject<'_>) -> Option<String> {
    let unit = subject
        .record
        .unit
        .as_deref()
        .map(|u| format!("{}{u}", words::NBSP))
        .unwrap_or_default();
    let ends = match (subject.record.lower, subject.record.upper) {
        (Some(lower), Some(upper)) => format!("{} to {}{unit}", exact(lower), exact(upper)),
        (Some(lower), None) => format!("at least {}{unit}", exact(lower)),
        (None, Some(upper)) => format!("at most {}{unit}", exact(upper)),
        (None, None) => return None,
    };
    let nominal = subject
        .record
        .nominal
        .map(|n| format!(", nominal {}{unit}", exact(n)))
        .unwrap_or_default();
    let rule = match subject.record.study.tolerance_rule {
        "two-sided" | "none" => String::new(),
        rule => format!(", its width by the rule “{rule}”"),
    };
    Some(format!("Tolerance: {ends}{nominal}{rule}."))
}

fn doubt_words(subject: Subject<'_>, doubt: Option<f64>) -> Option<String> {
    let size = subject.unit().three_digits(doubt?);
    Some(format!(
        "Hatched: three gauge standard deviations, {size}, to either side of a limit; a reading there may belong on the \
         other side."
    ))
}

fn part_words(subject: Subject<'_>, means: &[f64], not_drawn: usize) -> Option<String> {
    let (first, rest) = means.split_first()?;
    let (low, high) = rest.iter().fold((*first, *first), |(low, high), m| {
        (low.min(*m), high.max(*m))
    });
    let (lower, upper) = (subject.record.lower, subject.record.upper);
    let beyond_limits = means
        .iter()
        .filter(|m| lower.is_some_and(|l| **m < l) || upper.is_some_and(|u| **m > u))
        .count();
    let covered = subject
        .width()
        .map(|width| {
            let spread = words::percent((high - low) / width);
            if beyond_limits > 0 {
                format!("; their spread is {spread} of the tolerance's width")
            } else {
                format!("; they cover {spread} of the tolerance")
            }
        })
        .unwrap_or_default();
    let lie = |n: usize, whose: &str| match n {
        0 => String::new(),
        1 => format!("; 1 of them lies outside {whose}"),
        n => format!("; {n} of them lie outside {whose}"),
    };
    let beyond = lie(beyond_limits, "the tolerance") + &lie(not_drawn, "the picture");
    Some(format!(
        "Ticks: the means of the {}{covered}{beyond}.",
        count(means.len(), "study part")
    ))
}
