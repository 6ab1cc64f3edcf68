//! The page: who and when, one sentence, the ranking, a section a characteristic, then the evidence.
//!
//! Invariant: the page needs nothing from outside, no script and no colour; the same round gives the same bytes.

use jiff::tz::TimeZone;
use maud::{DOCTYPE, Markup, PreEscaped, html};
use restudy_config::Plan;
use restudy_engine::{Interaction, Judge, Limits, Standing};

use crate::analyse::study::Outcome;
use crate::analyse::worked::Worked;
use crate::evidence::Evidence;
use crate::now::in_zone;
use crate::plain::{dates, held_clause, interactions};

use super::axis::Axis;
use super::pieces::{standing, time};
use super::ranking::{PICTURES_MAX, has_pictures, ranked};
use super::section::{anchor, studied, without_study};
use super::sentence::{self, said_least, share_words, sure};
use super::subject::Subject;
use super::svg;
use super::words::{at_least, capital, count, limit, list, percent, short};

const STYLE: &str = include_str!("style.css");
const CAUTION: &str = "A study is evidence about a gauge, not a release of product. What follows from it, and every rule of a \
                       customer or of the law, is for the responsible qualified people to decide.";
/// Shares beyond this many act limits end at the edge of the ranking's bars.
const BARS_TO: f64 = 2.0;
/// Sentences about what was not used beyond these stay in the ledger.
const NOT_USED_MAX: usize = 200;

/// The page of one revision of a round: a whole HTML document.
#[must_use]
pub fn page(site: &str, zone: &TimeZone, plan: &Plan, worked: &Worked) -> String {
    let evidence = &worked.evidence;
    let ranked = ranked(&worked.outcomes);
    let worst = ranked
        .iter()
        .map(|o| o.standing())
        .max()
        .unwrap_or(Standing::NotJudged);
    let round = &evidence.round;
    html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                title { (plan.name) ", round " (round.number) ": " (worst.as_str()) }
                style { (PreEscaped(STYLE)) }
            }
            body {
                (svg::shared())
                header { (head(site, zone, plan, evidence)) }
                main {
                    p class="lead" { (standing(worst)) " " (sentence::round(&ranked)) }
                    (ranking(worked, &ranked, &plan.limits))
                    @for outcome in &ranked { (section(worked, outcome)) }
                    (not_used(evidence))
                    (method(plan, worked))
                    (sources(evidence))
                }
                footer { p { (CAUTION) } }
            }
        }
    }
    .into_string()
}

fn head(site: &str, zone: &TimeZone, plan: &Plan, evidence: &Evidence) -> Markup {
    let round = &evidence.round;
    let used = evidence.runs.len();
    html! {
        p class="site" { (site) " · gauge study" }
        h1 { (plan.name) ", round " (round.number) }
        dl {
            @if round.revision > 1 { div { dt { "Revision" } dd { (round.revision) ", replaces all before it" } } }
            @else { div { dt { "Revision" } dd { (round.revision) } } }
            @if let Some(label) = &round.label { div { dt { "Named" } dd { (label) } } }
            div { dt { "Instrument" } dd { (list(&evidence.instruments)) } }
            @if let Some(measured) = evidence.measured {
                div { dt { "Measured" } dd { (time(measured.first)) " to " (time(measured.last)) } }
            }
            @if let Some(closed) = round.closed {
                @let closed = in_zone(closed, zone);
                div { dt { "Closed" } dd { (time(closed.datetime())) " " (closed.strftime("%Z")) } }
            }
            div { dt { "Runs" } dd { (used) " of " (evidence.planned_runs()) " used" } }
        }
    }
}

fn ranking(worked: &Worked, ranked: &[&Outcome], limits: &Limits) -> Markup {
    let few_pictures = ranked.iter().any(|o| !has_pictures(worked, o));
    html! {
        section id="ranking" {
            h2 { "Which characteristics, worst first?" }
            ol class="ranking" { @for outcome in ranked { (row(worked, outcome, limits)) } }
            p class="small" {
                "Bars: the gauge's share of the tolerance, solid up to what it is at least; lines: the watch and the act limit; a bar with a gap goes on beyond the scale."
                @if few_pictures {
                    " With more than " (PICTURES_MAX) " characteristics, only those above a limit, not judged or changed have pictures below."
                }
            }
        }
    }
}

fn row(worked: &Worked, outcome: &Outcome, limits: &Limits) -> Markup {
    let record = outcome.study.as_ref().ok();
    let earlier = worked.earlier.get(&outcome.characteristic);
    let share = record
        .and_then(|r| share_words(r))
        .unwrap_or_else(|| "–".to_owned());
    let least = record
        .and_then(|r| said_least(r))
        .map(|least| format!("at least {}", at_least(least)));
    let before = match earlier {
        Some(earlier) => match earlier.study.share {
            Some(share) => format!(
                "was {}, {}",
                percent(share),
                earlier.study.standing.as_str()
            ),
            None => format!("was {}", earlier.study.standing.as_str()),
        },
        None => "first study".to_owned(),
    };
    let why_not = (outcome.standing() == Standing::NotJudged).then(|| match &outcome.study {
        Ok(record) => record.standing.why.clone(),
        Err(fault) => fault.clone(),
    });
    let details: Vec<String> = [
        why_not,
        record.and_then(|r| held_clause(r, limit)),
        least,
        record.and_then(|r| sure(r)),
        Some(before),
    ]
    .into_iter()
    .flatten()
    .collect();
    html! {
        li {
            div class="entry" {
                a href=(format!("#{}", anchor(outcome))) { (outcome.characteristic) }
                @if outcome.special { span class="special" { "special" } }
                (standing(outcome.standing()))
                strong { (share) }
            }
            (bar(outcome, limits))
            p class="small" { (details.join("; ")) }
        }
    }
}

/// A thin bar: share and its lower limit against the characteristic's limits, all rows to one scale.
fn bar(outcome: &Outcome, plan: &Limits) -> Markup {
    let Ok(record) = &outcome.study else {
        return html! {};
    };
    let share = &record.study.figures.gauge.share_of_tolerance;
    let Some((axis, estimate)) = Axis::over([0.0, BARS_TO * plan.act]).zip(share.estimate) else {
        return html! {};
    };
    let limits = record.standing.limits.unwrap_or(*plan);
    let (zero, solid) = (axis.at(0.0), share.at_least.unwrap_or(0.0).min(estimate));
    html! {
        svg class="bar" aria-hidden="true" width="100%" height="14" {
            (svg::block(zero, axis.at(estimate), 3.0, 8.0, "share-estimate"))
            (svg::block(zero, axis.at(solid), 3.0, 8.0, "share-sure"))
            @for limit in [limits.watch, limits.act] { (svg::upright(axis.at(limit), 0.0, 14.0, "limit")) }
            @if !axis.holds(estimate) { (svg::block(95.0, 96.5, 0.0, 14.0, "break")) }
        }
    }
}

fn section(worked: &Worked, outcome: &Outcome) -> Markup {
    match (&outcome.study, subject(worked, outcome)) {
        (Err(fault), _) => without_study(outcome, fault),
        (Ok(_), None) => without_study(outcome, "its readings are not at hand"),
        (Ok(_), Some(subject)) => studied(outcome, subject, has_pictures(worked, outcome)),
    }
}

fn subject<'a>(worked: &'a Worked, outcome: &'a Outcome) -> Option<Subject<'a>> {
    Some(Subject {
        record: outcome.study.as_ref().ok()?,
        feature: worked.evidence.features.get(outcome.feature)?,
        evidence: &worked.evidence,
        earlier: worked.earlier.get(&outcome.characteristic),
    })
}

fn not_used(evidence: &Evidence) -> Markup {
    let all = &evidence.not_used;
    html! {
        section {
            h2 { "What was not used, and why?" }
            @if all.is_empty() { p { "Nothing was left out." } }
            @else {
                ul class="plain" { @for sentence in all.iter().take(NOT_USED_MAX) { li { (capital(&dates::in_words(sentence))) } } }
                @if all.len() > NOT_USED_MAX { p { "And " (all.len() - NOT_USED_MAX) " more, which the ledger keeps." } }
            }
        }
    }
}

fn method(plan: &Plan, worked: &Worked) -> Markup {
    let evidence = &worked.evidence;
    let factors: Vec<String> = evidence
        .factors
        .iter()
        .map(|f| count(f.levels.len(), &f.word))
        .collect();
    let judged = match plan.judge {
        Judge::Estimate => "the estimated share".to_owned(),
        Judge::Chance(p) => format!("the share that is exceeded with {} confidence", limit(p)),
        Judge::Upper => "the upper limit of the share".to_owned(),
    };
    let limits = plan.limits;
    html! {
        section {
            h2 { "How was it worked out?" }
            ul {
                li { "Design: " (factors.join(" × ")) ", each cell " (count(evidence.trials, "trial")) "." }
                li { "Method: crossed random-effects analysis of variance" (interaction(plan, worked)) ". Components below zero count as zero." }
                li { "Share of tolerance: " (short(plan.spread_sds)) " gauge standard deviations over the width of the tolerance." }
                li { "Limits: " (limit(plan.confidence)) " two-sided, “at least” " (limit(plan.confidence)) " one-sided; exact for repeatability, modified large sample for the rest." }
                li { "Standing: " (judged) " against watch " (limit(limits.watch)) " and act " (limit(limits.act)) "; a limit once reached is left only below " (short(limits.back_below)) " of it. A characteristic may have limits of its own." }
                li { "“Confidence that the true share is above a limit”: the confidence at which the one-sided lower limit of the share meets that limit, to the nearest 5" (super::words::NBSP) "%." }
                @for (name, values) in &evidence.same { li { "Had to stay the same: " (name) " " (list(values)) "." } }
                li { "Worked out by Restudy " (env!("CARGO_PKG_VERSION")) ". The records beside this page keep all digits." }
            }
        }
    }
}

/// What becomes of the interaction, as far as the design has one.
fn interaction(plan: &Plan, worked: &Worked) -> String {
    let studied = worked.outcomes.iter().find_map(|o| subject(worked, o));
    let undivided = studied.and_then(Subject::undivided);
    let some = studied.is_none_or(|s| !interactions(&s.record.study).is_empty());
    let choice = match plan.interaction {
        Interaction::Keep => "is always kept".to_owned(),
        Interaction::PoolAbove(p) => {
            format!("is pooled into repeatability when its p is above {p}")
        }
    };
    let choice = if some {
        format!("; the interaction of parts with other factors {choice}")
    } else {
        String::new()
    };
    let one_trial = undivided.map_or_else(String::new, |term| {
        format!("; one trial does not tell {term} from repeatability")
    });
    format!("{choice}{one_trial}")
}

fn sources(evidence: &Evidence) -> Markup {
    html! {
        section {
            h2 { "From which exports?" }
            p { (capital(&count(evidence.source.len(), "export"))) ", each with the SHA-256 digest of its bytes." }
            ul class="sources" {
                @for source in &evidence.source { li { (source.export) " " code { (source.sha256) } } }
            }
        }
    }
}
