//! The share of tolerance as a bar against its limits.
//!
//! Model: solid up to what the share is at least, lighter from there to the estimate; a line at each limit.

use maud::html;
use restudy_engine::Limits;

use super::axis::Axis;
use super::pieces::Strip;
use super::subject::Subject;
use super::svg::{self, Side};
use super::words::{at_least, limit, percent_beside};

const BAR_TOP: f64 = 20.0;
const BAR_HEIGHT: f64 = 16.0;
const WATCH_TEXT: f64 = 54.0;
const ACT_TEXT: f64 = 70.0;
const HEIGHT: f64 = 76.0;
/// The scale goes at least this much beyond the act limit and the share.
const BEYOND: f64 = 1.2;

/// The bar; `None` when there is no share or no limit.
pub(super) fn share(subject: Subject<'_>) -> Option<Strip> {
    let limits = subject.limits()?;
    let estimate = subject.share().estimate?;
    let axis = scale(estimate, &limits)?;
    let solid = subject.share().at_least.unwrap_or(0.0).min(estimate);
    let (zero, end) = (axis.at(0.0), axis.at(estimate));
    let (watch, act) = (axis.at(limits.watch), axis.at(limits.act));
    let watch_side = if watch > 24.0 {
        Side::Left
    } else {
        Side::Right
    };
    let value = percent_beside(estimate, &[limits.watch, limits.act]);
    let body = html! {
        (svg::block(zero, end, BAR_TOP, BAR_HEIGHT, "share-estimate"))
        (svg::block(zero, axis.at(solid), BAR_TOP, BAR_HEIGHT, "share-sure"))
        (svg::upright(zero, BAR_TOP - 4.0, BAR_TOP + BAR_HEIGHT + 4.0, "axis"))
        (svg::upright(watch, BAR_TOP - 4.0, WATCH_TEXT + 2.0, "limit"))
        (svg::upright(act, BAR_TOP - 4.0, ACT_TEXT + 2.0, "limit"))
        (svg::beside(watch, WATCH_TEXT, watch_side, "halo", &format!("watch {}", limit(limits.watch))))
        (svg::beside(act, ACT_TEXT, Side::roomier(act), "halo", &format!("act {}", limit(limits.act))))
        (svg::beside(end, 14.0, Side::roomier(end), "strong halo", &value))
    };
    let least = match subject.share().at_least {
        Some(least) => format!(
            "Solid: at least {}, with {} confidence; lighter: from there to the estimate.",
            at_least(least),
            limit(subject.record.study.confidence)
        ),
        None => "Its lower limit is not known.".to_owned(),
    };
    let caption = format!("Bar: the gauge's share of the tolerance, {value}. {least}");
    let aloud = format!(
        "Watch limit {}, act limit {}.",
        limit(limits.watch),
        limit(limits.act)
    );
    Some(Strip {
        height: HEIGHT,
        body,
        caption,
        aloud,
    })
}

fn scale(estimate: f64, limits: &Limits) -> Option<Axis> {
    Axis::over([0.0, BEYOND * limits.act.max(estimate)])
}
