//! One characteristic's section: sentence, pictures, figures, remarks.

use maud::{Markup, html};
use restudy_engine::Standing;

use crate::analyse::study::Outcome;
use crate::record::Counts;

use super::band::band;
use super::causes::Ladder;
use super::lanes::lanes;
use super::pieces::{Strip, figure, standing};
use super::rungs::rungs;
use super::sentence;
use super::share::share;
use super::spread::Spread;
use super::subject::Subject;
use super::svg::lone_mark;
use super::tables::{figures, mean_squares};
use super::words::capital;

/// The place in the page that the ranking leads to.
pub(super) fn anchor(outcome: &Outcome) -> String {
    format!("characteristic-{}", outcome.feature + 1)
}

/// The section of a characteristic with a study.
pub(super) fn studied(outcome: &Outcome, subject: Subject<'_>, with_pictures: bool) -> Markup {
    let record = subject.record;
    html! {
        section id=(anchor(outcome)) {
            (heading(outcome))
            p { (sentence::characteristic(subject)) }
            @if with_pictures { (pictures(outcome, subject)) }
            (figures(subject))
            (mean_squares(subject))
            @if !record.study.remarks.is_empty() {
                h3 { "What else do the data say?" }
                ul { @for remark in &record.study.remarks { li { (remark.text) } } }
            }
            @if let Some(not_used) = not_used(&record.readings) { p class="small" { (not_used) } }
        }
    }
}

/// The section of a characteristic without a study.
pub(super) fn without_study(outcome: &Outcome, fault: &str) -> Markup {
    html! {
        section id=(anchor(outcome)) {
            (heading(outcome))
            p { "Not judged: " (fault) "." }
        }
    }
}

fn heading(outcome: &Outcome) -> Markup {
    html! {
        h2 { (outcome.characteristic) " " (standing(outcome.standing())) @if outcome.special { " " span class="special" { "special" } } }
    }
}

fn pictures(outcome: &Outcome, subject: Subject<'_>) -> Markup {
    let spread = Spread::of(subject);
    let id = anchor(outcome);
    let toleranced = subject.record.lower.is_some() || subject.record.upper.is_some();
    let question = if toleranced {
        "How much of the tolerance is gauge?"
    } else {
        "How wide is the gauge beside the parts?"
    };
    let how_much: Vec<Strip> = [band(subject, &spread), share(subject)]
        .into_iter()
        .flatten()
        .collect();
    let ladder = Ladder::of(subject);
    let what = if outcome.standing() >= Standing::Watch {
        "What is wrong?"
    } else {
        "What is it made of?"
    };
    html! {
        @if !how_much.is_empty() { (figure(&format!("{id}-band"), question, how_much, None, None)) }
        @if let Some((ladder, strip)) = ladder.as_ref().and_then(|l| Some((l, rungs(subject, l)?))) {
            @let advice = ladder.advice(subject, &spread);
            (figure(&format!("{id}-rungs"), what, vec![strip], None, advice.as_deref()))
        }
        @if let Some(strip) = lanes(subject, &spread) {
            (figure(&format!("{id}-lanes"), &who(subject), vec![strip], Some(legend(&spread)), None))
        }
    }
}

fn who(subject: Subject<'_>) -> String {
    match subject.readers() {
        Some((_, factor)) => format!("Which {}, on which part?", factor.word),
        None => "On which part do the readings differ?".to_owned(),
    }
}

fn legend(spread: &Spread) -> Markup {
    html! {
        @if spread.readers.len() > 1 {
            p class="legend" {
                @for (i, reader) in spread.readers.iter().enumerate() { span { (lone_mark(i)) " " (reader) } " " }
            }
        }
    }
}

fn not_used(counts: &Counts) -> Option<String> {
    let others = [
        (counts.superseded, "superseded by a later export"),
        (counts.surplus, "surplus"),
        (counts.set_aside, "set aside"),
        (counts.late, "too late"),
        (counts.excluded, "excluded by a person"),
    ];
    let others: Vec<String> = others
        .iter()
        .filter(|(n, _)| *n > 0)
        .map(|(n, what)| format!("{n} {what}"))
        .collect();
    (!others.is_empty()).then(|| {
        capital(&format!(
            "{} readings used; not used: {}.",
            counts.used,
            others.join(", ")
        ))
    })
}
