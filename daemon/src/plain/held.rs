//! A standing that is held although its limit is no longer exceeded.

use restudy_engine::{Limits, Standing};

use crate::record::Record;

/// The limit that is held by a judged share that is not above it; `None` when the share alone says the standing.
pub(crate) fn held(now: Standing, judged: Option<f64>, limits: Limits) -> Option<f64> {
    let limit = match now {
        Standing::Act => limits.act,
        Standing::Watch => limits.watch,
        Standing::Under | Standing::NotJudged => return None,
    };
    (judged? <= limit).then_some(limit)
}

/// The same as a clause; `percent` writes a limit. `None` when the standing needs no reason.
pub(crate) fn held_clause(record: &Record, percent: fn(f64) -> String) -> Option<String> {
    let (standing, limits) = (&record.standing, record.standing.limits?);
    let limit = held(standing.now, record.study.judged_share, limits)?;
    let figure = match standing.judged_by {
        Some("estimate") => "it",
        _ => "the judged figure",
    };
    Some(format!(
        "held, as {figure} is not below {} × {}",
        limits.back_below,
        percent(limit)
    ))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_limit_is_held_only_from_below() {
        use Standing::{Act, NotJudged, Under, Watch};
        let limits = Limits {
            watch: 0.1,
            act: 0.3,
            back_below: 0.85,
        };
        let table = [
            (Watch, Some(0.091), Some(0.1)),
            (Watch, Some(0.1), Some(0.1)),
            (Watch, Some(0.12), None),
            (Act, Some(0.27), Some(0.3)),
            (Act, Some(0.35), None),
            (Under, Some(0.05), None),
            (NotJudged, None, None),
        ];
        for (now, judged, limit) in table {
            assert_eq!(held(now, judged, limits), limit, "{now} {judged:?}");
        }
    }
}
