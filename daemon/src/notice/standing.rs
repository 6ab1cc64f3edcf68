//! The message of a round in which standings changed, a first study lies above a limit, or a study is missing.

use restudy_engine::Judge;

use super::cause::{self, Cause, Source};
use super::facts::{self, CAUTION};
use super::letter::{Letter, Line};
use super::news::{Item, News};
use super::past::Past;
use super::telling::Telling;
use super::words::{Scale, capital, count, limit, list, sentence, some};
use super::{Round, sure};
use crate::plain::dates::day;
use crate::record::Record;

/// Characteristics named in one line.
const IN_A_LINE: usize = 4;

/// `None` when nothing needs a person.
pub(super) fn letter(round: &Round<'_>) -> Option<Letter> {
    let head = round.items.iter().copied().find(|i| i.news.changed())?;
    let scale = scale(head);
    let telling = Telling {
        evidence: round.evidence(),
        scale: &scale,
    };
    let past = head.earlier.and_then(|e| Past::read(&e.study.record));
    let lead = match (head.news, head.record()) {
        (News::NewAct | News::NewWatch, Some(record)) => {
            up(round, head, record, past.as_ref(), telling)
        }
        (News::Back, Some(record)) => back(round, head, record, past.as_ref(), telling),
        (News::Failed, _) => failed(round, head),
        _ => lost(round, head),
    };
    let mut body = facts::round(round.config, round.evidence(), &round.items);
    if let Some(record) = head.record() {
        body.extend(facts::figures(head, record, telling, &scale));
    }
    body.push(facts::report(&round.report));
    Some(Letter {
        subject: subject(round, head),
        lead,
        body,
        foot: vec![
            format!(
                "You get this because {}. The next mail comes when a standing changes.",
                reasons(&round.items)
            ),
            CAUTION.into(),
            round.signature(),
        ],
    })
}

/// `2 standings changed and 1 first study lies above a limit`.
fn reasons(items: &[Item<'_>]) -> String {
    let told =
        |of: fn(&Item<'_>) -> bool| items.iter().filter(|i| i.news.changed() && of(i)).count();
    let failed = told(|i| i.news == News::Failed);
    let first = told(|i| i.news != News::Failed && i.earlier.is_none());
    let changed = told(|i| i.news != News::Failed && i.earlier.is_some());
    let lie = match first {
        1 => "1 first study lies above a limit".into(),
        n => format!("{n} first studies lie above a limit"),
    };
    let reasons = [
        (changed, format!("{} changed", count(changed, "standing"))),
        (first, lie),
        (
            failed,
            format!(
                "{} could not be worked out",
                count(failed, "characteristic")
            ),
        ),
    ];
    let reasons: Vec<String> = reasons
        .into_iter()
        .filter_map(|(n, reason)| (n > 0).then_some(reason))
        .collect();
    list(&reasons)
}

pub(super) fn scale(item: Item<'_>) -> Scale {
    let record = item.record();
    Scale::of(
        item.feature.unit.as_deref(),
        record.and_then(|r| r.study.figures.gauge.sd.estimate),
    )
}

fn subject(round: &Round<'_>, head: Item<'_>) -> String {
    let label = head.label();
    let others = round.items.iter().filter(|i| i.news == head.news).count() - 1;
    let more = (others > 0).then(|| format!("+{others} more"));
    let (state, what) = match head.news {
        News::NewAct => (
            "ACT",
            format!("{label} takes {} of tolerance", sure::share(head)),
        ),
        News::NewWatch => (
            "WATCH",
            format!("{label} takes {} of tolerance", sure::share(head)),
        ),
        News::Back => {
            let before = head
                .share_before()
                .map_or_else(|| "not judged".into(), super::words::percent);
            let aside = [Some(format!("was {before}")), more.clone()]
                .into_iter()
                .flatten()
                .collect::<Vec<_>>();
            let at = match round.plan.judge {
                Judge::Estimate => sure::share(head),
                _ => format!("\"{}\", estimate {}", head.now(), sure::share(head)),
            };
            return format!(
                "BACK: {}: {label} at {at} of tolerance ({})",
                round.place(),
                aside.join("; ")
            );
        }
        _ => {
            let failed = if head.news == News::Failed {
                " could not be worked out"
            } else {
                ""
            };
            let before = head.share_before().map_or_else(String::new, |s| {
                format!(" (was {} of tolerance)", super::words::percent(s))
            });
            ("NOT JUDGED", format!("{label}{failed}{before}"))
        }
    };
    let more = more.map(|more| format!(" ({more})")).unwrap_or_default();
    format!("{state}: {}: {what}{more}", round.place())
}

fn line(label: &'static str, text: impl Into<String>) -> Line {
    Line {
        label,
        text: text.into(),
    }
}

fn up(
    round: &Round<'_>,
    head: Item<'_>,
    record: &Record,
    past: Option<&Past>,
    telling: Telling<'_>,
) -> Vec<Line> {
    let cause = cause::of(round.evidence(), head.feature, record);
    let step = cause
        .as_ref()
        .map_or_else(|| "repeat the whole round".to_owned(), |c| telling.next(c));
    let window = match (head.earlier, head.share_before()) {
        (Some(earlier), Some(_)) => format!(
            "Measured since {}, the last round below this limit: whether those results are affected is your call",
            day(earlier.day(round.zone()))
        ),
        _ => "Since when it has been above the limit is not known".into(),
    };
    vec![
        line("", sure::what(head, record, past, round.zone())),
        line("How sure", sure::above(head, record, round.evidence())),
        line("Why", why(cause.as_ref(), record, past, telling)),
        line("Also", also(round, head, cause.as_ref())),
        line("Next", format!("{step}. {window}.")),
    ]
}

/// The cause, the share without it, and whether repeatability moved.
pub(super) fn why(
    cause: Option<&Cause>,
    record: &Record,
    past: Option<&Past>,
    telling: Telling<'_>,
) -> String {
    let told = cause.map_or_else(
        || "the data do not tell the sources apart".to_owned(),
        |c| telling.why(c),
    );
    let without = cause.and_then(|c| telling.without(c));
    let moved = past.and_then(|past| telling.repeatability(&record.study, past));
    let sentences: Vec<String> = [Some(told), without, moved].into_iter().flatten().collect();
    format!("{}.", sentences.join(". "))
}

fn also(round: &Round<'_>, head: Item<'_>, cause: Option<&Cause>) -> String {
    let others = || {
        round
            .items
            .iter()
            .copied()
            .filter(|i| i.outcome.feature != head.outcome.feature)
    };
    let group = |news: News, title: &str, told: fn(Item<'_>) -> String| {
        let names: Vec<String> = others().filter(|i| i.news == news).map(told).collect();
        (!names.is_empty()).then(|| format!("{title}: {}", some(&names, IN_A_LINE)))
    };
    let with_share: fn(Item<'_>) -> String = |i| format!("{} {}", i.label(), sure::share(i));
    let with_both: fn(Item<'_>) -> String =
        |i| format!("{} {}", i.label(), sure::share_and_before(i));
    let groups = [
        group(News::NewAct, "new at act", with_share),
        same_level(round, head, cause).filter(|_| head.news == News::NewAct),
        group(News::NewWatch, "new at watch", with_share),
        same_level(round, head, cause).filter(|_| head.news == News::NewWatch),
        group(News::StillAct, "still at act", with_both),
        group(News::Failed, "could not be worked out", |i| {
            format!("{} ({})", i.label(), sentence(i.why()))
        }),
        group(News::Lost, "not judged any more", |i| i.label()),
        group(News::Back, "back", with_both),
    ];
    let told: Vec<String> = groups
        .into_iter()
        .flatten()
        .enumerate()
        .map(|(n, s)| if n == 0 { s } else { capital(&s) })
        .collect();
    if told.is_empty() {
        nothing_else(head, others())
    } else {
        format!("{}.", told.join(". "))
    }
}

/// That the others are not news: a first study has nothing that it could have changed from.
fn nothing_else<'a>(head: Item<'_>, mut others: impl Iterator<Item = Item<'a>> + Clone) -> String {
    let nothing = if head.earlier.is_some() {
        "nothing else changed."
    } else if others.clone().next().is_none() {
        "no other characteristic was studied."
    } else if others.any(|i| i.earlier.is_some()) {
        "no other standing changed."
    } else if head.news == News::Failed {
        "no first study lies above a limit."
    } else {
        "no other first study lies above a limit."
    };
    nothing.into()
}

/// How many of the others with the same news have the same level standing out.
fn same_level(round: &Round<'_>, head: Item<'_>, cause: Option<&Cause>) -> Option<String> {
    let Source::Level { factor, level, .. } = cause?.source else {
        return None;
    };
    let up: Vec<Item<'_>> = round
        .items
        .iter()
        .copied()
        .filter(|i| i.outcome.feature != head.outcome.feature && i.news == head.news)
        .collect();
    let alike = |item: &&Item<'_>| {
        let found = item
            .record()
            .and_then(|record| cause::of(round.evidence(), item.feature, record));
        found.is_some_and(|c| matches!(c.source, Source::Level { factor: f, level: l, .. } if (f, l) == (factor, level)))
    };
    let same = up.iter().filter(alike).count();
    let name = super::words::name(&round.evidence().factors[factor].levels[level]);
    match (same, up.len()) {
        (0, _) => None,
        (1, 1) => Some(format!("{name} stands out there too")),
        (same, all) if same == all => Some(format!("{name} stands out on all {all} of these too")),
        (same, all) => Some(format!("{name} stands out on {same} of these {all} too")),
    }
}

fn back(
    round: &Round<'_>,
    head: Item<'_>,
    record: &Record,
    past: Option<&Past>,
    telling: Telling<'_>,
) -> Vec<Line> {
    let moved = past.map(|past| {
        let told = [
            telling.shrunk(&record.study, past),
            telling.repeatability(&record.study, past),
        ];
        told.into_iter().flatten().collect::<Vec<_>>().join(". ")
    });
    let held: Vec<String> = round
        .items
        .iter()
        .filter_map(|i| sure::held(*i, round.plan.judge))
        .take(IN_A_LINE)
        .collect();
    let mut also = also(round, head, None);
    if !held.is_empty() {
        also = format!("{also} {}.", capital(&held.join(". ")));
    }
    let before = head.before().map_or("above its limit", |b| b.as_str());
    let begun = head
        .limit()
        .filter(|(at, _)| head.share().is_some_and(|share| share > *at))
        .map_or_else(String::new, |(at, _)| {
            format!(
                "the estimate still lies above {}: finish what was begun at the gauge; ",
                limit(at)
            )
        });
    vec![
        line("", sure::back(head, round.plan.judge)),
        line(
            "How sure",
            sure::below(head).map_or_else(|| "the data do not tell.".into(), |s| format!("{s}.")),
        ),
        line(
            "What changed",
            moved
                .filter(|m| !m.is_empty())
                .map_or_else(|| "the records do not tell.".into(), |m| format!("{m}.")),
        ),
        line("Also", also),
        line(
            "Next",
            format!(
                "{begun}whether results measured while it stood at \"{before}\" need another look is your call."
            ),
        ),
    ]
}

fn failed(round: &Round<'_>, head: Item<'_>) -> Vec<Line> {
    let before = if head.earlier.is_some() {
        before(round, head)
    } else {
        " This is its first study.".into()
    };
    vec![
        line(
            "",
            format!(
                "{} could not be worked out.{before}",
                capital(&head.label())
            ),
        ),
        line("Why", format!("{}.", sentence(head.why()))),
        line("Also", also(round, head, None)),
        line(
            "Next",
            "set right what the reason names, in the exports or in the plan. Until then nothing says where it stands.",
        ),
    ]
}

/// What a characteristic that is not judged took before.
fn before(round: &Round<'_>, head: Item<'_>) -> String {
    match (head.share_before(), head.earlier) {
        (Some(share), Some(earlier)) => {
            format!(
                " It was {} of the tolerance on {}.",
                super::words::percent(share),
                day(earlier.day(round.zone()))
            )
        }
        _ => String::new(),
    }
}

fn lost(round: &Round<'_>, head: Item<'_>) -> Vec<Line> {
    let before = before(round, head);
    vec![
        line(
            "",
            format!("{} is not judged any more.{before}", capital(&head.label())),
        ),
        line("Why", format!("{}.", sentence(head.why()))),
        line("Also", also(round, head, None)),
        line(
            "Next",
            "give the plan or the exports what is missing. Until then nothing says where it stands.",
        ),
    ]
}
