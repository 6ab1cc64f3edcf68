//! The message that corrects what was told about a round.

use restudy_engine::Standing;

use super::facts::{self, CAUTION};
use super::letter::{Letter, Line};
use super::news::Item;
use super::past::Past;
use super::standing::{scale, why};
use super::telling::Telling;
use super::words::{self, capital, count, limit, percent, some};
use super::{Round, Told, cause, sure};

/// Corrections named in one line.
const IN_A_LINE: usize = 4;

/// A characteristic whose printed result changed.
struct Correction<'a> {
    item: Item<'a>,
    standing: Standing,
    share: Option<f64>,
}

/// `None` when everything that people were told still holds.
pub(super) fn letter(round: &Round<'_>, told: &Told) -> Option<Letter> {
    let corrections = corrections(round, told);
    let gone: Vec<String> = told
        .studies
        .iter()
        .filter(|row| {
            !round
                .items
                .iter()
                .any(|i| i.outcome.characteristic == row.characteristic)
        })
        .map(|row| words::name(&row.characteristic))
        .collect();
    let Some(head) = corrections.first() else {
        return (!gone.is_empty()).then(|| only_gone(round, told, &gone));
    };
    let scale = scale(head.item);
    let telling = Telling {
        evidence: round.evidence(),
        scale: &scale,
    };
    let mut lead = vec![line("", first(told, head, round))];
    if let Some(record) = head.item.record() {
        let cause = cause::of(round.evidence(), head.item.feature, record);
        let past = head.item.earlier.and_then(|e| Past::read(&e.study.record));
        lead.push(line(
            "How sure",
            sure::above(head.item, record, round.evidence()),
        ));
        lead.push(line(
            "Why",
            format!(
                "{} {}",
                reason(round),
                why(cause.as_ref(), record, past.as_ref(), telling)
            ),
        ));
    } else {
        lead.push(line(
            "Why",
            format!("{} {}.", reason(round), words::sentence(head.item.why())),
        ));
    }
    let mut others: Vec<String> = corrections[1..].iter().map(brief).collect();
    others.extend(
        gone.iter()
            .map(|name| format!("{name} is not in the round any more")),
    );
    let also = if others.is_empty() {
        "nothing else that was told changes.".into()
    } else {
        format!("{}.", some(&others, IN_A_LINE))
    };
    lead.push(line("Also", also));
    lead.push(next());
    let mut body = facts::round(round.config, round.evidence(), &round.items);
    if let Some(record) = head.item.record() {
        body.extend(facts::figures(head.item, record, telling, &scale));
    }
    body.push(facts::report(&round.report));
    Some(Letter {
        subject: format!("CORRECTED: {}: {}", round.place(), what(head)),
        lead,
        body,
        foot: foot(round),
    })
}

fn corrections<'a>(round: &Round<'a>, told: &Told) -> Vec<Correction<'a>> {
    let before = |item: &Item<'a>| {
        told.studies
            .iter()
            .find(|row| row.characteristic == item.outcome.characteristic)
    };
    let differs = |item: &Item<'a>| {
        let row = before(item);
        let (standing, share) =
            row.map_or((Standing::NotJudged, None), |row| (row.standing, row.share));
        let printed = |share: Option<f64>| share.map(percent);
        let new_and_failed = row.is_none() && item.outcome.study.is_err();
        let differs =
            standing != item.now() || printed(share) != printed(item.share()) || new_and_failed;
        differs.then_some(Correction {
            item: *item,
            standing,
            share,
        })
    };
    round.items.iter().filter_map(differs).collect()
}

fn line(label: &'static str, text: impl Into<String>) -> Line {
    Line {
        label,
        text: text.into(),
    }
}

/// `bore A 21 % (not 35 %)`.
fn brief(correction: &Correction<'_>) -> String {
    let item = correction.item;
    match correction.share {
        _ if item.outcome.study.is_err() => what(correction),
        Some(told) if item.share().map(percent) == Some(percent(told)) => what(correction),
        Some(told) => format!(
            "{} {} (not {})",
            item.label(),
            sure::share(item),
            percent(told)
        ),
        None => format!(
            "{} {} (had not been judged)",
            item.label(),
            sure::share(item)
        ),
    }
}

/// `bore A takes 21 % of tolerance, not 35 %`.
fn what(correction: &Correction<'_>) -> String {
    let item = correction.item;
    let label = item.label();
    match (item.share(), correction.share) {
        (None, Some(told)) if item.outcome.study.is_err() => format!(
            "{label} could not be worked out, and had been told with {}",
            percent(told)
        ),
        (None, None) if item.outcome.study.is_err() => format!("{label} could not be worked out"),
        (Some(now), Some(told)) if percent(now) == percent(told) => {
            format!(
                "{label} stands at {}, not at {}",
                item.now(),
                correction.standing
            )
        }
        (Some(_), Some(told)) => format!(
            "{label} takes {} of tolerance, not {}",
            sure::share(item),
            percent(told)
        ),
        (Some(_), None) => format!(
            "{label} takes {} of tolerance, and had not been judged",
            sure::share(item)
        ),
        (None, Some(told)) => format!(
            "{label} is not judged, and had been told with {}",
            percent(told)
        ),
        (None, None) => format!(
            "{label} stands at {}, not at {}",
            item.now(),
            correction.standing
        ),
    }
}

fn first(told: &Told, head: &Correction<'_>, round: &Round<'_>) -> String {
    let mut text = format!("{}.", capital(&what(head)));
    if head.standing == head.item.now() && head.item.record().is_some() {
        text.push_str(&format!(" It stays at \"{}\".", head.item.now()));
    } else if head.item.share().is_some() {
        text.push_str(&format!(
            " It stands at \"{}\", not at \"{}\".",
            head.item.now(),
            head.standing
        ));
    }
    if let Some(record) = head
        .item
        .record()
        .filter(|r| r.standing.judged_by != Some("estimate"))
    {
        text.push_str(&format!(
            " {}.",
            capital(&words::sentence(&record.standing.why))
        ));
    }
    if let Some(limits) = head.item.limits() {
        text.push_str(&format!(
            " Limits {} and {}.",
            limit(limits.watch),
            limit(limits.act)
        ));
    }
    format!(
        "{text} This corrects the notice on round {}: \"{}\".",
        round.evidence().round.number,
        words::sentence(&told.subject)
    )
}

/// Why there is a revision, as far as the readings tell.
fn reason(round: &Round<'_>) -> String {
    let replaced: usize = round
        .evidence()
        .features
        .iter()
        .map(|f| f.counts.superseded)
        .sum();
    match replaced {
        0 => "runs of the round changed after it was closed.".into(),
        n => format!(
            "runs of the round changed after it was closed ({} replaced by later exports).",
            count(n, "reading")
        ),
    }
}

fn next() -> Line {
    line(
        "Next",
        "look again at what was decided on the earlier notice; standings are compared with the round before, not with the notice.",
    )
}

fn only_gone(round: &Round<'_>, told: &Told, gone: &[String]) -> Letter {
    let what = format!("{} no longer in the round", some(gone, IN_A_LINE));
    let number = round.evidence().round.number;
    let mut body = facts::round(round.config, round.evidence(), &round.items);
    body.push(facts::report(&round.report));
    Letter {
        subject: format!("CORRECTED: {}: {what}", round.place()),
        lead: vec![
            line(
                "",
                format!(
                    "{}. This corrects the notice on round {number}: \"{}\".",
                    capital(&what),
                    words::sentence(&told.subject)
                ),
            ),
            line("Why", reason(round)),
            next(),
        ],
        body,
        foot: foot(round),
    }
}

fn foot(round: &Round<'_>) -> Vec<String> {
    vec![
        "You get this because an earlier notice on this round no longer holds. The next mail comes when a standing changes.".into(),
        CAUTION.into(),
        round.signature(),
    ]
}
