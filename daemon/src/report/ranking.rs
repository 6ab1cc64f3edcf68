//! Which characteristic comes first, and which ones get pictures.

use restudy_engine::Standing;

use crate::analyse::study::Outcome;
use crate::analyse::worked::Worked;
use crate::natural;

/// Up to so many characteristics each gets its pictures.
pub(super) const PICTURES_MAX: usize = 40;

/// The outcomes, worst first: by standing, then special ones, then chance above the limit, then share.
pub(super) fn ranked(outcomes: &[Outcome]) -> Vec<&Outcome> {
    let mut ranked: Vec<&Outcome> = outcomes.iter().collect();
    ranked.sort_by(|a, b| {
        urgency(b.standing())
            .cmp(&urgency(a.standing()))
            .then(b.special.cmp(&a.special))
            .then_with(|| chance(b).total_cmp(&chance(a)))
            .then_with(|| {
                b.share()
                    .unwrap_or(0.0)
                    .total_cmp(&a.share().unwrap_or(0.0))
            })
            .then_with(|| natural::compare(&a.characteristic, &b.characteristic))
    });
    ranked
}

/// Whether a characteristic gets its pictures: all do while they are few, then those above a limit, not judged,
/// or changed.
pub(super) fn has_pictures(worked: &Worked, outcome: &Outcome) -> bool {
    let now = outcome.standing();
    let before = worked
        .earlier
        .get(&outcome.characteristic)
        .map(|e| e.study.standing);
    worked.outcomes.len() <= PICTURES_MAX
        || now != Standing::Under
        || before.is_some_and(|before| before != now)
}

fn urgency(standing: Standing) -> u8 {
    match standing {
        Standing::Act => 3,
        Standing::Watch => 2,
        Standing::NotJudged => 1,
        Standing::Under => 0,
    }
}

fn chance(outcome: &Outcome) -> f64 {
    let Ok(record) = &outcome.study else {
        return 0.0;
    };
    let above = record.study.chance_above;
    let chance = if record.standing.now == Standing::Act {
        above.act
    } else {
        above.watch
    };
    chance.unwrap_or(0.0)
}
