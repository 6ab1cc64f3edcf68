//! What each characteristic's standing means for a reader, and in which order it is told.

use std::cmp::Ordering;

use restudy_engine::{Limits, Standing};

use crate::analyse::study::Outcome;
use crate::analyse::worked::Worked;
use crate::evidence::Feature;
use crate::ledger::Earlier;
use crate::record::Record;

/// In the order in which it is told.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum News {
    /// Newly at act.
    NewAct,
    /// Newly at watch, from below or from nowhere.
    NewWatch,
    /// At act, as before.
    StillAct,
    /// Could not be worked out, in a first study or after one that was judged.
    Failed,
    /// Judged before, not any more.
    Lost,
    /// Below a limit that it held, or judged again and under both.
    Back,
    /// At watch, as before.
    StillWatch,
    /// Nothing to tell.
    Quiet,
}

impl News {
    /// From the standing in the plan's round before, if there was one, to now; `worked_out`: there is a study.
    pub(super) fn of(before: Option<Standing>, now: Standing, worked_out: bool) -> Self {
        use Standing::{Act, NotJudged, Under, Watch};
        match (before, now) {
            (Some(Act), Act) => Self::StillAct,
            (_, Act) => Self::NewAct,
            (Some(Watch), Watch) => Self::StillWatch,
            (Some(Act), Watch) => Self::Back,
            (_, Watch) => Self::NewWatch,
            (None | Some(Act | Watch | Under), NotJudged) if !worked_out => Self::Failed,
            (Some(Act | Watch | Under), NotJudged) => Self::Lost,
            (Some(Act | Watch | NotJudged), Under) => Self::Back,
            (Some(Under) | None, Under) | (Some(NotJudged) | None, NotJudged) => Self::Quiet,
        }
    }

    /// True when a person is told of it.
    pub(super) const fn changed(self) -> bool {
        matches!(
            self,
            Self::NewAct | Self::NewWatch | Self::Failed | Self::Lost | Self::Back
        )
    }
}

/// One characteristic as a notice sees it.
#[derive(Clone, Copy)]
pub(super) struct Item<'a> {
    pub(super) outcome: &'a Outcome,
    pub(super) feature: &'a Feature,
    pub(super) earlier: Option<&'a Earlier>,
    pub(super) news: News,
}

impl<'a> Item<'a> {
    pub(super) fn record(self) -> Option<&'a Record> {
        self.outcome.study.as_ref().ok().map(AsRef::as_ref)
    }

    pub(super) fn label(self) -> String {
        super::words::name(&self.outcome.characteristic)
    }

    pub(super) fn now(self) -> Standing {
        self.outcome.standing()
    }

    pub(super) fn before(self) -> Option<Standing> {
        self.earlier.map(|e| e.study.standing)
    }

    pub(super) fn share(self) -> Option<f64> {
        self.outcome.share()
    }

    pub(super) fn share_before(self) -> Option<f64> {
        self.earlier?.study.share
    }

    pub(super) fn limits(self) -> Option<Limits> {
        self.record()?.standing.limits
    }

    /// The limit that the news is about, and the chance that the true share lies above it.
    pub(super) fn limit(self) -> Option<(f64, Option<f64>)> {
        let (limits, chance) = (self.limits()?, self.record()?.study.chance_above);
        let act = self.now() == Standing::Act
            || self.news == News::Back && self.before() == Some(Standing::Act);
        Some(if act {
            (limits.act, chance.act)
        } else {
            (limits.watch, chance.watch)
        })
    }

    /// Why it is not judged.
    pub(super) fn why(self) -> &'a str {
        match &self.outcome.study {
            Ok(record) => &record.standing.why,
            Err(fault) => fault,
        }
    }

    fn rank(&self, other: &Self) -> Ordering {
        let chance = |item: &Self| item.limit().and_then(|(_, chance)| chance).unwrap_or(0.0);
        let share = |item: &Self| item.share().unwrap_or(0.0);
        self.news
            .cmp(&other.news)
            .then_with(|| other.outcome.special.cmp(&self.outcome.special))
            .then_with(|| {
                if self.news == News::Back {
                    other.before().cmp(&self.before())
                } else {
                    Ordering::Equal
                }
            })
            .then_with(|| chance(other).total_cmp(&chance(self)))
            .then_with(|| share(other).total_cmp(&share(self)))
    }
}

/// All characteristics of a round, the first to be told first.
pub(super) fn ranked(worked: &Worked) -> Vec<Item<'_>> {
    let mut items: Vec<Item<'_>> = worked
        .outcomes
        .iter()
        .filter_map(|outcome| {
            let earlier = worked.earlier.get(&outcome.characteristic);
            let before = earlier.map(|e| e.study.standing);
            let news = News::of(before, outcome.standing(), outcome.study.is_ok());
            let feature = worked.evidence.features.get(outcome.feature)?;
            Some(Item {
                outcome,
                feature,
                earlier,
                news,
            })
        })
        .collect();
    items.sort_by(Item::rank);
    items
}

#[cfg(test)]
mod tests {
    use super::News::{Back, Failed, Lost, NewAct, NewWatch, Quiet, StillAct, StillWatch};
    use super::*;
    use Standing::{Act, NotJudged, Under, Watch};

    #[test]
    fn only_changes_and_first_crossings_are_news() {
        let table = [
            (None, Under, Quiet),
            (None, NotJudged, Quiet),
            (None, Watch, NewWatch),
            (None, Act, NewAct),
            (Some(Under), Under, Quiet),
            (Some(Under), Watch, NewWatch),
            (Some(Under), Act, NewAct),
            (Some(Under), NotJudged, Lost),
            (Some(Watch), Under, Back),
            (Some(Watch), Watch, StillWatch),
            (Some(Watch), Act, NewAct),
            (Some(Act), Under, Back),
            (Some(Act), Watch, Back),
            (Some(Act), Act, StillAct),
            (Some(Act), NotJudged, Lost),
            (Some(NotJudged), NotJudged, Quiet),
            (Some(NotJudged), Watch, NewWatch),
            (Some(NotJudged), Under, Back),
        ];
        for (before, now, news) in table {
            assert_eq!(News::of(before, now, true), news, "{before:?} to {now:?}");
            assert_eq!(
                news.changed(),
                before.map_or(now >= Watch, |b| b != now),
                "{before:?} to {now:?}"
            );
        }
    }

    #[test]
    fn what_could_not_be_worked_out_is_told_once() {
        let table = [
            (None, Failed),
            (Some(Under), Failed),
            (Some(Watch), Failed),
            (Some(Act), Failed),
            (Some(NotJudged), Quiet),
        ];
        for (before, news) in table {
            assert_eq!(News::of(before, NotJudged, false), news, "{before:?}");
            assert_eq!(news.changed(), before != Some(NotJudged), "{before:?}");
        }
    }
}
