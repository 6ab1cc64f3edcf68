//! What a study says, in sentences: the standing, how sure that is, and what was before.

use restudy_engine::{Limits, Standing};

use crate::analyse::study::Outcome;
use crate::ledger::Earlier;
use crate::plain::UpperEnd;
use crate::record::Record;

use super::subject::Subject;
use super::unjudged::unjudged;
use super::words::{at_least, at_most, chance, limit, list, percent, percent_beside};

/// A lower limit below this is not worth a word.
const SAID_FROM: f64 = 0.01;

/// The whole round in two sentences: the worst characteristic, then how many stand where; the outcomes come worst
/// first.
pub(super) fn round(ranked: &[&Outcome]) -> String {
    let judged = ranked.iter().find_map(|o| {
        Some((*o, o.study.as_ref().ok()?)).filter(|(o, _)| o.standing() != Standing::NotJudged)
    });
    let Some((worst, record)) = judged else {
        return unjudged(ranked);
    };
    let share = share_words(record).unwrap_or_else(|| "an unknown part".to_owned());
    let sure = sure(record)
        .map(|sure| format!(", with {sure}"))
        .unwrap_or_default();
    let others = if ranked.len() > 1 {
        format!(" {}.", counts(ranked))
    } else {
        String::new()
    };
    let name = &worst.characteristic;
    let limits = record.standing.limits;
    match (worst.standing(), limits) {
        (standing @ (Standing::Act | Standing::Watch), Some(limits)) => {
            format!(
                "The gauge takes {share} of the tolerance of {name}, {}{sure}.{others}",
                place(record, standing, &limits)
            )
        }
        _ if ranked.len() == 1 => {
            format!("The gauge takes {share} of the tolerance of {name}, under its limits{sure}.")
        }
        _ => format!(
            "The gauge takes the largest share of the tolerance of {name}: {share}, under its limits{sure}.{others}"
        ),
    }
}

/// One characteristic in one or two sentences.
pub(super) fn characteristic(subject: Subject<'_>) -> String {
    let record = subject.record;
    let before = subject
        .earlier
        .map(|e| format!(" {}", before(e)))
        .unwrap_or_else(|| " This is its first study.".to_owned());
    let (Some(share), Some(limits)) = (share_words(record), record.standing.limits) else {
        return format!("Not judged: {}.{before}", record.standing.why);
    };
    let place = match record.standing.now {
        Standing::NotJudged => return format!("Not judged: {}.{before}", record.standing.why),
        standing => place(record, standing, &limits),
    };
    let confidence = limit(record.study.confidence);
    let least = said_least(record).filter(|_| record.standing.now != Standing::Under);
    let least = least
        .map(|least| format!("; {confidence} that it is above {}", at_least(least)))
        .unwrap_or_default();
    let sure = sure(record)
        .map(|sure| format!(" How sure: {sure}{least}."))
        .unwrap_or_default();
    let end = UpperEnd::of(&record.study, &subject.evidence.factors);
    let end = end.sentence(&confidence, at_most);
    format!("The gauge takes {share} of the tolerance, {place}.{sure} {end}.{before}")
}

/// The one-sided lower limit of the share where it says something.
pub(super) fn said_least(record: &Record) -> Option<f64> {
    let share = &record.study.figures.gauge.share_of_tolerance;
    share.at_least.filter(|least| *least >= SAID_FROM)
}

/// The study of the round before: its share and standing.
pub(super) fn before(earlier: &Earlier) -> String {
    let standing = earlier.study.standing.as_str();
    match earlier.study.share {
        Some(share) => format!(
            "In round {} it was {}, “{standing}”.",
            earlier.number,
            percent(share)
        ),
        None => format!("In round {} it was “{standing}”.", earlier.number),
    }
}

/// How sure the standing is; absent without a chance.
pub(super) fn sure(record: &Record) -> Option<String> {
    let limits = record.standing.limits?;
    let above = record.study.chance_above;
    match record.standing.now {
        Standing::Act => Some(format!(
            "{} confidence that the true share is above {}",
            chance(above.act?),
            limit(limits.act)
        )),
        Standing::Watch => Some(format!(
            "{} confidence that the true share is above {} and {} that it is above {}",
            chance(above.watch?),
            limit(limits.watch),
            chance(above.act?),
            limit(limits.act)
        )),
        Standing::Under => Some(format!(
            "{} confidence that the true share is below {}",
            chance(1.0 - above.watch?),
            limit(limits.watch)
        )),
        Standing::NotJudged => None,
    }
}

/// The share with as many digits as show on which side of its limits it lies.
pub(super) fn share_words(record: &Record) -> Option<String> {
    let share = record.study.figures.gauge.share_of_tolerance.estimate?;
    let limits = record
        .standing
        .limits
        .map(|l| vec![l.watch, l.act])
        .unwrap_or_default();
    Some(percent_beside(share, &limits))
}

/// `Of 4 characteristics, 1 is at “act” and 3 under the limits`.
fn counts(ranked: &[&Outcome]) -> String {
    let places = [
        (Standing::Act, "at “act”"),
        (Standing::Watch, "at “watch”"),
        (Standing::Under, "under the limits"),
        (Standing::NotJudged, "not judged"),
    ];
    let counted = places.map(|(standing, place)| {
        let at = ranked.iter().filter(|o| o.standing() == standing);
        (at.count(), place)
    });
    let counts: Vec<String> = counted
        .into_iter()
        .filter(|(n, _)| *n > 0)
        .enumerate()
        .map(|(i, (n, place))| match (i, n) {
            (0, 1) => format!("1 is {place}"),
            (0, n) => format!("{n} are {place}"),
            (_, n) => format!("{n} {place}"),
        })
        .collect();
    format!("Of {} characteristics, {}", ranked.len(), list(&counts))
}

/// Where the judged figure lies; the record's own reason where the plain one does not tell it.
fn place(record: &Record, standing: Standing, limits: &Limits) -> String {
    let share = record
        .study
        .figures
        .gauge
        .share_of_tolerance
        .estimate
        .unwrap_or(0.0);
    let by_share = record.standing.judged_by == Some("estimate");
    match standing {
        Standing::Act if by_share && share > limits.act => {
            format!("above the act limit of {}", limit(limits.act))
        }
        Standing::Watch if by_share && share > limits.watch && share <= limits.act => {
            format!("above the watch limit of {}", limit(limits.watch))
        }
        Standing::Under if by_share => {
            format!("not above the watch limit of {}", limit(limits.watch))
        }
        other => format!(
            "which stands at “{}” because {}",
            other.as_str(),
            record.standing.why
        ),
    }
}
