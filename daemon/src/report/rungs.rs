//! Rungs: the gauge as it is, and what it would be with one cause taken away, on one scale.

use maud::{Markup, html};

use super::axis::Axis;
use super::causes::{Ladder, Rung, amount};
use super::pieces::Strip;
use super::subject::Subject;
use super::svg::{self, Side};
use super::words::{capital, cut, limit};

const RUNG: f64 = 44.0;
const TEXT: f64 = 14.0;
const LINE: f64 = 27.0;
/// Letters that fit beside an amount on a narrow screen.
const LABEL_MAX: usize = 40;
/// The scale goes this much beyond the gauge as it is; whiskers beyond it end in an arrow.
const BEYOND: f64 = 1.35;
/// A limit is drawn while the scale reaches it or needs only this much more.
const STRETCH_MAX: f64 = 2.0;

/// The rungs; `None` when the gauge has no spread to explain.
pub(super) fn rungs(subject: Subject<'_>, ladder: &Ladder) -> Option<Strip> {
    let now = ladder.now.sd;
    if now <= 0.0 {
        return None;
    }
    let per_sd = subject.share_per_sd();
    let limits: Vec<(&str, f64)> = subject
        .limits()
        .zip(per_sd)
        .map(|(l, per_sd)| {
            [
                ("watch", l.watch, l.watch / per_sd),
                ("act", l.act, l.act / per_sd),
            ]
        })
        .into_iter()
        .flatten()
        .filter(|(.., sd)| *sd <= STRETCH_MAX * now)
        .map(|(name, _, sd)| (name, sd))
        .collect();
    let reach = limits
        .iter()
        .map(|(_, sd)| 1.1 * sd)
        .fold(BEYOND * now, f64::max);
    let axis = Axis::over([0.0, reach])?;
    let rows: Vec<&Rung> = std::iter::once(&ladder.now).chain(&ladder.steps).collect();
    let bottom = RUNG * rows.len() as f64;
    let unit = subject.unit();
    let body = html! {
        @for (i, rung) in rows.iter().enumerate() {
            @let top = RUNG * i as f64;
            @for (_, sd) in &limits { (svg::upright(axis.at(*sd), top + LINE - 7.0, top + LINE + 9.0, "limit faint")) }
            (row(axis, rung, now, top))
            (svg::from(0.0, top + TEXT, "halo", &capital(&cut(&rung.change.label(), LABEL_MAX))))
            (svg::up_to(100.0, top + TEXT, "strong halo", &amount(rung.sd, per_sd, &unit)))
        }
        @for (i, (name, sd)) in limits.iter().enumerate() {
            @let at = axis.at(*sd);
            @let text = format!("{name} {}", limit(sd * per_sd.unwrap_or(1.0)));
            (svg::upright(at, bottom - 6.0, bottom + 16.0 * (i + 1) as f64, "limit faint"))
            (svg::beside(at, bottom + 14.0 + 16.0 * i as f64, Side::roomier(at), "halo", &text))
        }
    };
    let height = bottom + 16.0 * limits.len() as f64 + 6.0;
    let steps: Vec<String> = rows
        .iter()
        .map(|r| format!("{}: {}", r.change.label(), amount(r.sd, per_sd, &unit)))
        .collect();
    let confidence = limit(subject.record.study.confidence);
    let caption = format!(
        "Each rung takes away one thing only. Whiskers: {confidence} limits where they are known."
    );
    Some(Strip {
        height,
        body,
        caption,
        aloud: format!("{}.", capital(&steps.join("; "))),
    })
}

fn row(axis: Axis, rung: &Rung, now: f64, top: f64) -> Markup {
    let (y, at) = (top + LINE, axis.at(rung.sd));
    let whisker = rung
        .lower
        .map(|lower| (lower, rung.upper.filter(|u| axis.holds(*u))));
    html! {
        (svg::level(axis.at(0.0), axis.at(axis.high()), y, "track"))
        @if rung.sd < now { (svg::level(at, axis.at(now), y, "step")) }
        @if let Some((lower, upper)) = whisker {
            @let end = axis.at(upper.unwrap_or(axis.high()));
            (svg::level(axis.at(lower), end, y, "whisker"))
            (svg::upright(axis.at(lower), y - 5.0, y + 5.0, "whisker"))
            @match upper {
                Some(_) => (svg::upright(end, y - 5.0, y + 5.0, "whisker")),
                None => (svg::arrow(end, y)),
            }
        }
        (svg::dot(at, y, 5.0, "rung"))
    }
}
