//! What stands below the leading lines of every message: the round, the counts, the figures, where to read on.

use std::path::Path;

use restudy_config::Config;
use restudy_engine::{Standing, WITHIN_CELLS};

use super::letter::Block;
use super::news::{Item, News};
use super::sure::{self, share_and_before};
use super::telling::Telling;
use super::words::{Scale, at_least, capital, count, limit, percent, sentence};
use crate::evidence::Evidence;
use crate::now::in_zone;
use crate::plain::{dates, held_clause, in_error};
use crate::record::Record;

/// Characteristics named, and runs named that were not used.
pub(super) const NAMED_MAX: usize = 5;

/// Whose decision it is.
pub(super) const CAUTION: &str = "A study is evidence about a gauge, not a release of product. Decisions, and rules of \
  your customer or of the law, are for the people responsible for them.";

/// The round, the counts, the ranked characteristics, and what was not used.
pub(super) fn round(config: &Config, evidence: &Evidence, items: &[Item<'_>]) -> Vec<Block> {
    let mut blocks = vec![
        Block::Text(closed(config, evidence)),
        Block::Text(counts(items)),
    ];
    let told: Vec<&Item<'_>> = items.iter().filter(|i| i.news != News::Quiet).collect();
    if told.len() > 1 {
        let mut lines: Vec<String> = told.iter().take(NAMED_MAX).map(|i| ranked(**i)).collect();
        if told.len() > NAMED_MAX {
            lines.push(format!(
                "and {} more, in the report",
                told.len() - NAMED_MAX
            ));
        }
        blocks.push(Block::List {
            title: "Ranked:".into(),
            items: lines,
        });
    }
    if !evidence.not_used.is_empty() {
        let mut lines: Vec<String> = evidence
            .not_used
            .iter()
            .take(NAMED_MAX)
            .map(|s| sentence(s))
            .collect();
        if evidence.not_used.len() > NAMED_MAX {
            lines.push(format!(
                "and {} more, in the report",
                evidence.not_used.len() - NAMED_MAX
            ));
        }
        blocks.push(Block::List {
            title: "Not used, and why:".into(),
            items: lines,
        });
    }
    blocks
}

fn closed(config: &Config, evidence: &Evidence) -> String {
    let round = &evidence.round;
    let closed = round
        .closed
        .map(|at| in_zone(at, &config.site.zone).datetime())
        .map(|at| format!(", closed {}", dates::minute(at)))
        .unwrap_or_default();
    let revision = if round.revision > 1 {
        format!(", revision {}", round.revision)
    } else {
        String::new()
    };
    let measured = evidence.measured.map_or_else(String::new, |m| {
        format!(" Measured {}.", dates::span(m.first, m.last))
    });
    let not_used = match evidence.not_used.len() {
        0 => String::new(),
        n => format!("; {n} not used"),
    };
    format!(
        "Round {}{closed}{revision}.{measured} {} of {} used{not_used}.",
        round.number,
        evidence.runs.len(),
        count(evidence.planned_runs(), "run"),
    )
}

fn counts(items: &[Item<'_>]) -> String {
    let any_before = items.iter().any(|i| i.earlier.is_some());
    let parts: Vec<String> = [
        Standing::Act,
        Standing::Watch,
        Standing::Under,
        Standing::NotJudged,
    ]
    .into_iter()
    .map(|standing| {
        let now = items.iter().filter(|i| i.now() == standing).count();
        let before = items
            .iter()
            .filter(|i| i.before() == Some(standing))
            .count();
        if any_before {
            format!("{standing} {now} (was {before})")
        } else {
            format!("{standing} {now}")
        }
    })
    .collect();
    let first = items.iter().filter(|i| i.earlier.is_none()).count();
    let first = if any_before && first > 0 {
        format!("; {first} for the first time")
    } else {
        String::new()
    };
    let why: Vec<String> = items
        .iter()
        .filter(|i| i.now() == Standing::NotJudged)
        .take(NAMED_MAX)
        .map(|i| format!("{}: {}", i.label(), sentence(i.why())))
        .collect();
    let why = if why.is_empty() {
        String::new()
    } else {
        format!(" Not judged: {}.", why.join("; "))
    };
    format!(
        "{}: {}{first}.{why}",
        count(items.len(), "characteristic"),
        parts.join(", ")
    )
}

fn ranked(item: Item<'_>) -> String {
    if item.now() == Standing::NotJudged {
        return not_judged(item);
    }
    let mut line = format!("{}: {}", item.label(), item.now());
    match item.before() {
        Some(before) if before == item.now() => line.push_str(" as before"),
        Some(before) => line.push_str(&format!(" (was {before})")),
        None => {}
    }
    line.push_str(&format!(", {}", share_and_before(item)));
    let record = item.record();
    if let Some(held) = record.and_then(|record| held_clause(record, limit)) {
        line.push_str(&format!(", {held}"));
    }
    let least = record.and_then(|r| r.study.figures.gauge.share_of_tolerance.at_least);
    if let Some(least) = least.filter(|least| *least >= sure::SAID_FROM) {
        line.push_str(&format!(", at least {}", at_least(least)));
    }
    if item.outcome.special {
        line.push_str("; special");
    }
    line
}

/// `bore A: could not be worked out (was under, 18 %)`.
fn not_judged(item: Item<'_>) -> String {
    let now = if item.news == News::Failed {
        "could not be worked out"
    } else {
        "not judged any more"
    };
    let before = match (item.before(), item.share_before()) {
        (Some(before), Some(share)) => format!("was {before}, {}", percent(share)),
        (Some(before), None) => format!("was {before}"),
        (None, _) => "first study".into(),
    };
    let special = if item.outcome.special {
        "; special"
    } else {
        ""
    };
    format!("{}: {now} ({before}){special}", item.label())
}

/// Spreads and mean squares of one characteristic, as a reader's own sheet would have them.
pub(super) fn figures(
    item: Item<'_>,
    record: &Record,
    telling: Telling<'_>,
    scale: &Scale,
) -> Vec<Block> {
    let figures = &record.study.figures;
    let of = |spread: &restudy_engine::Spread| scale.figure(spread.sd.estimate);
    let ndc = record
        .study
        .ndc
        .whole
        .map_or_else(|| "–".into(), |n| n.to_string());
    let unit = if scale.unit.is_empty() {
        String::new()
    } else {
        format!(" in {}", scale.unit)
    };
    let spreads = format!(
        "{}, standard deviations{unit}: EV {}, AV {}, GRR {}, PV {}; ndc {ndc}.",
        capital(&item.label()),
        of(&figures.repeatability),
        of(&figures.reproducibility),
        of(&figures.gauge),
        of(&figures.part),
    );
    let squares: Vec<String> = record
        .study
        .mean_squares
        .iter()
        .filter_map(|line| {
            let name = if line.name == WITHIN_CELLS {
                "within cells".into()
            } else {
                telling.in_plant_words(&line.name)
            };
            Some(format!("{name} {} ({})", scale.squared(line.ms?), line.df))
        })
        .collect();
    let unit = if scale.unit.is_empty() {
        String::new()
    } else {
        format!(" in {}²", scale.unit)
    };
    let squares = format!("Mean squares{unit} (df): {}.", squares.join(", "));
    let one_trial = one_trial(record, telling);
    [Some(spreads), Some(squares), one_trial]
        .into_iter()
        .flatten()
        .map(Block::Text)
        .collect()
}

/// What one trial cannot tell, with the plant's words for the factors.
fn one_trial(record: &Record, telling: Telling<'_>) -> Option<String> {
    let study = &record.study;
    let remark = study.remarks.iter().find(|r| r.kind == "one trial")?;
    let term = in_error(study)?.name;
    Some(remark.text.replace(&term, &telling.in_plant_words(&term)))
}

/// Where to read on.
pub(super) fn report(path: &Path) -> Block {
    Block::Text(format!(
        "Report (on the server that runs Restudy): {}",
        path.display()
    ))
}
