//! Part lanes: every reading as a mark about its part's mean, readers side by side.
//!
//! Model: one lane a part, in it one row a reader, every reader with a mark of its own; on top a lane with each
//! reader's mean over all parts. In percent of the tolerance, or in the readings' unit where there is none.

use maud::{Markup, html};

use super::axis::Axis;
use super::pieces::Strip;
use super::spread::{Part, Spread};
use super::subject::Subject;
use super::svg;
use super::unit::Unit;
use super::words::{NBSP, count, cut, list, short};

/// More parts than this are not drawn; those with the widest deviations are.
const PARTS_MAX: usize = 40;
const LABEL: f64 = 16.0;
const FOOT: f64 = 5.0;
const SCALE: f64 = 24.0;
const NAME_MAX: usize = 36;
/// Room at each end, as a part of the largest deviation.
const MARGIN: f64 = 0.06;

/// The lanes; `None` when there is nothing to draw.
pub(super) fn lanes(subject: Subject<'_>, spread: &Spread) -> Option<Strip> {
    let reach = (1.0 + MARGIN) * spread.reach();
    let axis = Axis::over([-reach, reach])?;
    let drawn = drawn(&spread.parts);
    let row = row_height(spread.readers.len());
    let lane = LABEL + row * spread.readers.len() as f64 + FOOT;
    let means = spread.readers.len() > 1;
    let lanes = drawn.len() + usize::from(means);
    let bottom = lane * lanes as f64;
    let y = |lane_index: usize, reader: usize| {
        lane * lane_index as f64 + LABEL + row * (reader as f64 + 0.5)
    };
    let offsets = spread.offsets();
    let body = html! {
        @for i in (0..lanes).step_by(2) { (svg::block(0.0, 100.0, lane * i as f64, lane, "lane")) }
        (scale(subject, axis, bottom))
        @if means {
            (svg::from(1.0, 13.0, "small strong", "mean of all parts"))
            @for (reader, offset) in offsets.iter().enumerate() {
                @if let Some(offset) = offset { (svg::mark(reader, axis.at(*offset), y(0, reader))) }
            }
        }
        @for (i, part) in drawn.iter().enumerate() {
            @let at = i + usize::from(means);
            (svg::from(1.0, lane * at as f64 + 13.0, "small", &cut(&part.name, NAME_MAX)))
            @for (reader, deviation) in &part.deviations {
                (svg::mark(*reader, axis.at(*deviation), y(at, *reader)))
            }
        }
    };
    let caption = caption(subject, spread, drawn.len());
    Some(Strip {
        height: bottom + SCALE,
        body,
        caption,
        aloud: offset_words(subject, spread),
    })
}

fn scale(subject: Subject<'_>, axis: Axis, bottom: f64) -> Markup {
    let whole = subject.whole();
    let unit = subject.unit();
    // Ticks are round in what is printed, not in reading units.
    let per_printed = whole.map_or(1.0 / unit.of(1.0), |whole| whole / 100.0);
    let printed = Axis::over([axis.low() / per_printed, axis.high() / per_printed]);
    let name = if whole.is_some() { "%" } else { unit.name() };
    html! {
        @for tick in printed.map(|a| a.ticks(4)).unwrap_or_default() {
            @let x = axis.at(tick * per_printed);
            (svg::upright(x, 0.0, bottom, if tick == 0.0 { "axis" } else { "grid" }))
            @if axis.labels(tick * per_printed) {
                (svg::centred(x, bottom + 16.0, "small", format!("{}{}{NBSP}{name}", if tick > 0.0 { "+" } else { "" }, short(tick)).trim_end()))
            }
        }
    }
}

/// All parts, or the ones with the widest deviations; in the plan's order.
fn drawn(parts: &[Part]) -> Vec<&Part> {
    let mut by_reach: Vec<usize> = (0..parts.len()).collect();
    by_reach.sort_by(|&a, &b| {
        parts[b]
            .reach()
            .total_cmp(&parts[a].reach())
            .then(a.cmp(&b))
    });
    by_reach.truncate(PARTS_MAX);
    by_reach.sort_unstable();
    by_reach.into_iter().map(|i| &parts[i]).collect()
}

fn row_height(readers: usize) -> f64 {
    match readers {
        0..=4 => 10.0,
        5..=8 => 8.0,
        _ => 6.0,
    }
}

fn caption(subject: Subject<'_>, spread: &Spread, drawn: usize) -> String {
    let readings: usize = spread.parts.iter().map(|p| p.deviations.len()).sum();
    let scale = match subject.whole() {
        Some(whole) => {
            let one = whole / 100.0;
            let unit = Unit::for_size(subject.record.unit.as_deref(), one);
            format!(
                "in percent of the tolerance; 1{NBSP}% is {}",
                unit.short(one)
            )
        }
        None if subject.unit().name().is_empty() => "in the readings' own unit".to_owned(),
        None => format!("in {}", subject.unit().name()),
    };
    let left_out = match spread.parts.len() - drawn {
        0 => String::new(),
        n => format!(
            " {} with narrower deviations are not drawn.",
            count(n, "part")
        ),
    };
    format!(
        "{}, each as a mark about its part's mean, {scale}.{left_out}",
        count(readings, "reading")
    )
}

/// Each reader's mean over all parts.
fn offset_words(subject: Subject<'_>, spread: &Spread) -> String {
    let unit = subject.unit();
    let of = |(name, offset): (&String, Option<f64>)| {
        Some(format!("{name} {}", unit.three_digits(offset?)))
    };
    let means: Vec<String> = spread
        .readers
        .iter()
        .zip(spread.offsets())
        .filter_map(of)
        .collect();
    if means.len() > 1 {
        format!("Mean of all parts: {}.", list(&means))
    } else {
        String::new()
    }
}
