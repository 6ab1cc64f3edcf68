//! How far up the true share may lie, as far as a study tells.

use restudy_engine::{PART, Study, WITHIN_CELLS};

use super::plural;
use crate::evidence::Factor;

/// An upper limit from here on says nothing about a share of tolerance.
const USELESS_FROM: f64 = 1.0;
/// A factor with at most so many degrees of freedom takes the upper end away by itself.
const FEW_DF: usize = 3;

/// The upper end of the gauge's share of tolerance.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum UpperEnd {
    /// The two-sided upper limit.
    AtMost(f64),
    /// The limit lies below the estimate.
    BelowEstimate,
    /// None that helps: this factor has too few levels.
    Few { levels: usize, word: String },
    /// None that helps.
    Useless,
}

impl UpperEnd {
    /// Of a study with those factors.
    pub(crate) fn of(study: &Study, factors: &[Factor]) -> Self {
        let share = &study.figures.gauge.share_of_tolerance;
        match (share.upper, share.estimate) {
            (Some(upper), Some(estimate)) if upper < estimate => UpperEnd::BelowEstimate,
            (Some(upper), _) if upper < USELESS_FROM => UpperEnd::AtMost(upper),
            _ => few(study, factors).unwrap_or(UpperEnd::Useless),
        }
    }

    /// As a sentence without its full stop; `percent` writes an upper limit.
    pub(crate) fn sentence(&self, confidence: &str, percent: fn(f64) -> String) -> String {
        match self {
            UpperEnd::AtMost(upper) => {
                format!("Two-sided, {confidence}: at most {}", percent(*upper))
            }
            UpperEnd::BelowEstimate => {
                "The estimate lies above its upper limit: components below zero count as zero in it"
                    .into()
            }
            UpperEnd::Few { levels, word } => {
                format!(
                    "{} {} give no useful upper end",
                    number(*levels),
                    plural(word)
                )
            }
            UpperEnd::Useless => "The data give no useful upper end".into(),
        }
    }
}

/// The factor with the fewest levels, where their number is the cause; never without spread between repeats.
fn few(study: &Study, factors: &[Factor]) -> Option<UpperEnd> {
    let repeats = study.mean_squares.iter().find(|l| l.name == WITHIN_CELLS);
    repeats.and_then(|l| l.ms).filter(|ms| *ms > 0.0)?;
    let others = factors
        .iter()
        .filter(|f| f.name != PART && f.levels.len() > 1);
    let fewest = others.min_by_key(|f| f.levels.len())?;
    let levels = fewest.levels.len();
    (levels - 1 <= FEW_DF).then(|| UpperEnd::Few {
        levels,
        word: fewest.word.clone(),
    })
}

fn number(n: usize) -> String {
    match n {
        2 => "Two".into(),
        3 => "Three".into(),
        4 => "Four".into(),
        n => n.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use restudy_engine::{Design, Interaction, Judge, Settings, Tolerance, analyse};

    use super::*;

    /// Five parts, so many loadings that read `step` apart in turn, two trials `2 repeat` apart, tolerance 1.
    fn end(levels: usize, step: f64, repeat: f64) -> UpperEnd {
        let factors = [(PART, 5), ("appraiser", levels)];
        let design = factors.map(|(name, levels)| restudy_engine::Factor::crossed(name, levels));
        let design = Design::new(design.to_vec()).unwrap();
        let cells: Vec<usize> = (0..5 * levels).flat_map(|cell| [cell, cell]).collect();
        let value = |(row, cell): (usize, &usize)| {
            let (part, loading) = ((cell / levels) as f64, (cell % levels % 2) as f64);
            part + step * loading + repeat * (row as f64 % 2.0 - 0.5)
        };
        let values: Vec<f64> = cells.iter().enumerate().map(value).collect();
        let tolerance = Tolerance {
            lower: Some(0.0),
            upper: Some(1.0),
            one_sided: None,
        };
        let settings = Settings {
            confidence: 0.95,
            spread_sds: 6.0,
            interaction: Interaction::Keep,
            process: None,
            limits: None,
            judge: Judge::Estimate,
        };
        let study = analyse(&design, &cells, &values, &tolerance, &settings).unwrap();
        let factor = |name: &str, word: &str, levels: usize| Factor {
            name: name.into(),
            word: word.into(),
            levels: (0..levels).map(|l| l.to_string()).collect(),
        };
        UpperEnd::of(
            &study,
            &[
                factor(PART, "part", 5),
                factor("appraiser", "loading", levels),
            ],
        )
    }

    #[test]
    fn few_levels_are_blamed_only_when_they_are_the_cause() {
        let words = |end: UpperEnd| end.sentence("95 %", |x| format!("{x}"));
        assert_eq!(
            words(end(3, 0.06, 0.01)),
            "Three loadings give no useful upper end"
        );
        assert_eq!(
            words(end(4, 0.1, 0.01)),
            "Four loadings give no useful upper end"
        );
        assert_eq!(
            words(end(5, 0.2, 0.01)),
            "The data give no useful upper end"
        );
        assert_eq!(
            words(end(3, 0.06, 0.0)),
            "The data give no useful upper end"
        );
        assert!(matches!(end(3, 0.005, 0.05), UpperEnd::AtMost(upper) if upper < 1.0));
    }
}
