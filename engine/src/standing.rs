//! Standing: where a share lies against its two limits.
//!
//! A standing rises as soon as the share exceeds a limit. A limit that was held before stays held while
//! the share is at least `back_below` × the limit, so that luck alone does not make it flutter.

use serde::{Deserialize, Serialize};

use crate::settings::Limits;

/// Where a share lies against its limits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub enum Standing {
    /// There is no share to judge.
    #[serde(rename = "not judged")]
    NotJudged,
    /// Neither limit is held.
    #[serde(rename = "under")]
    Under,
    /// The watch limit is held.
    #[serde(rename = "watch")]
    Watch,
    /// The act limit is held.
    #[serde(rename = "act")]
    Act,
}

impl Standing {
    /// The word that records and texts use.
    pub fn as_str(self) -> &'static str {
        match self {
            Standing::NotJudged => "not judged",
            Standing::Under => "under",
            Standing::Watch => "watch",
            Standing::Act => "act",
        }
    }
}

impl std::fmt::Display for Standing {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.as_str())
    }
}

/// The standing of a share, given the standing of the round before.
pub fn standing(share: Option<f64>, limits: &Limits, before: Option<Standing>) -> Standing {
    let Some(share) = share.filter(|s| !s.is_nan()) else {
        return Standing::NotJudged;
    };
    let held = |limit: f64, standing: Standing| {
        share > limit
            || (before.is_some_and(|b| b >= standing) && share >= limits.back_below * limit)
    };
    if held(limits.act, Standing::Act) {
        Standing::Act
    } else if held(limits.watch, Standing::Watch) {
        Standing::Watch
    } else {
        Standing::Under
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const LIMITS: Limits = Limits {
        watch: 0.10,
        act: 0.30,
        back_below: 0.85,
    };

    #[test]
    fn the_table_of_shares_and_standings_before() {
        use Standing::*;
        let table = [
            (0.05, None, Under),
            (0.10, None, Under),
            (0.11, None, Watch),
            (0.30, None, Watch),
            (0.31, None, Act),
            (0.29, Some(Act), Act),
            (0.255, Some(Act), Act),
            (0.2549, Some(Act), Watch),
            (0.29, Some(Watch), Watch),
            (0.09, Some(Watch), Watch),
            (0.09, Some(Act), Watch),
            (0.0849, Some(Watch), Under),
            (0.0849, Some(Act), Under),
            (0.09, Some(Under), Under),
            (0.29, Some(NotJudged), Watch),
            (f64::INFINITY, None, Act),
        ];
        for (share, before, now) in table {
            assert_eq!(
                standing(Some(share), &LIMITS, before),
                now,
                "share {share}, before {before:?}"
            );
        }
    }

    #[test]
    fn without_a_share_nothing_is_judged() {
        assert_eq!(
            standing(None, &LIMITS, Some(Standing::Act)),
            Standing::NotJudged
        );
        assert_eq!(standing(Some(f64::NAN), &LIMITS, None), Standing::NotJudged);
    }

    #[test]
    fn the_words_are_the_ones_that_are_serialised() {
        for s in [
            Standing::NotJudged,
            Standing::Under,
            Standing::Watch,
            Standing::Act,
        ] {
            let written = serde_json::to_string(&s).unwrap();
            assert_eq!(written, format!("\"{}\"", s.as_str()));
            assert_eq!(serde_json::from_str::<Standing>(&written).unwrap(), s);
        }
    }
}
