//! The figures: causes across, questions down; and the mean squares they come from.

use maud::{Markup, html};
use restudy_engine::{Line, MeanSquare, Spread, WITHIN_CELLS};

use super::subject::{Cause, Subject};
use super::words::{NBSP, limit, list, p_value, percent, three_digits};
use crate::plain::{interactions, is_interaction, pooled};

const NONE: &str = "–";
/// Where a long heading may break on a narrow screen.
const SOFT_HYPHEN: char = '\u{ad}';

/// One cause with the answers to each question.
struct Column {
    head: String,
    sd: Option<f64>,
    at_least: Option<f64>,
    share_of_tolerance: Option<f64>,
    share_of_tv: Option<f64>,
}

impl Column {
    fn of(head: &str, spread: &Spread) -> Column {
        Column {
            head: head.to_owned(),
            sd: spread.sd.estimate,
            at_least: spread.sd.at_least,
            share_of_tolerance: spread.share_of_tolerance.estimate,
            share_of_tv: spread.share_of_tv.estimate,
        }
    }
}

/// EV, AV, the interaction in it, GRR, PV: how big, at least, how much of the tolerance, how much of all variation.
pub(super) fn figures(subject: Subject<'_>) -> Markup {
    let unit = subject.unit();
    let figures = &subject.record.study.figures;
    let columns: Vec<Column> = [
        Some(Column::of("EV", &figures.repeatability)),
        Some(Column::of("AV", &figures.reproducibility)),
        interaction(subject),
        Some(Column::of("GRR", &figures.gauge)),
        Some(Column::of("PV", &figures.part)),
    ]
    .into_iter()
    .flatten()
    .collect();
    let number = |x: Option<f64>| x.map_or(NONE.to_owned(), |x| three_digits(unit.of(x)));
    let share = |x: Option<f64>| x.map_or(NONE.to_owned(), percent);
    let in_unit = if unit.name().is_empty() {
        String::new()
    } else {
        format!(", {}", unit.name())
    };
    let confidence = limit(subject.record.study.confidence);
    html! {
        div class="wide" tabindex="0" {
            table class="figures" {
                caption { "Figures: one column a cause, sd" (in_unit) }
                thead { tr { td {} @for column in &columns { th scope="col" { (column.head) } } } }
                tbody {
                    tr { th scope="row" { "How big?" } @for c in &columns { td { (number(c.sd)) } } }
                    tr { th scope="row" { "At least (" (confidence) ")" } @for c in &columns { td { (number(c.at_least)) } } }
                    tr { th scope="row" { "Of the tolerance" } @for c in &columns { td { (share(c.share_of_tolerance)) } } }
                    tr { th scope="row" { "Of TV" } @for c in &columns { td { (share(c.share_of_tv)) } } }
                }
            }
        }
        p class="small" { (notes(subject)) }
    }
}

/// The part of AV that changes from part to part; `None` when the analysis has no such term.
fn interaction(subject: Subject<'_>) -> Option<Column> {
    let terms: Vec<_> = subject
        .causes()
        .filter(|(cause, _)| *cause == Cause::Interaction)
        .map(|(_, c)| c)
        .collect();
    let first = terms.first()?;
    let alone = terms.len() == 1;
    let sd = terms
        .iter()
        .map(|c| c.variance.estimate)
        .sum::<Option<f64>>()
        .map(f64::sqrt);
    let total = subject
        .record
        .study
        .figures
        .total
        .sd
        .estimate
        .filter(|t| *t > 0.0);
    Some(Column {
        head: format!("inter{SOFT_HYPHEN}action{}", if alone { "" } else { "s" }),
        sd,
        at_least: first.sd.at_least.filter(|_| alone),
        share_of_tolerance: sd
            .zip(subject.share_per_sd())
            .map(|(sd, per_sd)| sd * per_sd),
        share_of_tv: sd.zip(total).map(|(sd, total)| sd / total),
    })
}

fn notes(subject: Subject<'_>) -> String {
    let study = &subject.record.study;
    let unit = subject.unit();
    let mut held = String::new();
    if study.interaction.kept {
        held.push_str("AV holds the interaction; ");
    }
    if let Some(term) = subject.undivided() {
        held.push_str(&format!(
            "EV holds {term}, which one trial does not tell from it; "
        ));
    }
    let total = study
        .figures
        .total
        .sd
        .estimate
        .map_or(NONE.to_owned(), |tv| unit.three_digits(tv));
    let ndc = match study.ndc.whole {
        Some(whole) => {
            format!("ndc {whole} (1.41{NBSP}×{NBSP}PV{NBSP}÷{NBSP}GRR, cut to a whole number)")
        }
        None => format!(
            "ndc {NONE}: {}",
            study
                .part_to_gauge
                .why
                .as_deref()
                .unwrap_or("it is not known")
        ),
    };
    format!("{held}GRR² = EV² + AV², TV² = GRR² + PV². TV {total}; {ndc}.")
}

/// Mean squares with their degrees of freedom, and the choice about the interaction.
pub(super) fn mean_squares(subject: Subject<'_>) -> Markup {
    let unit = subject.unit();
    let in_unit = if unit.name().is_empty() {
        String::new()
    } else {
        format!(", {}", unit.squared_name())
    };
    let lines = subject
        .record
        .study
        .mean_squares
        .iter()
        .filter_map(|line| Some((line, line.ms?)));
    html! {
        div class="wide" tabindex="0" {
            table class="mean-squares" {
                caption { "Mean squares" (in_unit) }
                thead { tr { td {} th scope="col" { "mean square" } th scope="col" { "df" } } }
                tbody {
                    @for (line, ms) in lines {
                        tr { th scope="row" { (line_name(subject, line)) } td { (unit.squared(ms)) } td { (line.df) } }
                    }
                }
            }
        }
        @if let Some(words) = interaction_choice(subject) { p class="small" { (words) } }
    }
}

/// A line in the plant's words; the one within cells with what it holds.
fn line_name(subject: Subject<'_>, line: &MeanSquare) -> String {
    let term = subject.term(&line.of, &line.within);
    if line.name == WITHIN_CELLS {
        format!("{WITHIN_CELLS} ({term})")
    } else {
        term
    }
}

fn interaction_choice(subject: Subject<'_>) -> Option<String> {
    let study = &subject.record.study;
    let choice = &study.interaction;
    let other = choice.other_reading?;
    let tested = interactions(study);
    let pooled = pooled(study);
    let kept: Vec<String> = study
        .mean_squares
        .iter()
        .filter(|line| is_interaction(&line.of))
        .map(|line| subject.term(&line.of, &line.within))
        .collect();
    let names = |lines: &[Line]| {
        list(
            &lines
                .iter()
                .map(|l| subject.term(&l.of, &l.within))
                .collect::<Vec<_>>(),
        )
    };
    let done = match (&kept[..], &pooled[..]) {
        (_, []) => "kept".to_owned(),
        ([], _) => "pooled into repeatability".to_owned(),
        (kept, pooled) => format!(
            "partly pooled into repeatability: {} went into it, {} remain{} in the table",
            names(pooled),
            list(kept),
            if kept.len() == 1 { "s" } else { "" }
        ),
    };
    let p = choice
        .p
        .map_or(format!("p {NONE}"), |p| p_value(p, choice.pool_above));
    let of_which = if tested.len() > 1 {
        format!(" of {}", names(&tested[tested.len() - 1..]))
    } else {
        String::new()
    };
    let why = match choice.pool_above {
        Some(limit) => format!("the plan pools it when p is above {limit}"),
        None => "the plan always keeps it".to_owned(),
    };
    let other = match (other.share_of_tolerance, other.gauge_sd) {
        (Some(share), _) => format!(" The other way the share would be {}.", percent(share)),
        (None, Some(sd)) => format!(
            " The other way GRR would be {}.",
            subject.unit().three_digits(sd)
        ),
        (None, None) => String::new(),
    };
    Some(format!("Interaction {done} ({p}{of_which}): {why}.{other}"))
}
