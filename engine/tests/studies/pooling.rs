//! Interaction kept or pooled.

use restudy_engine::{Interaction, Settings, Study};

use crate::invented::three_factors;
use crate::sound::{TWO_SIDED, settings, study_with};

#[test]
fn pooling_goes_from_the_largest_interaction_down() {
    let readings = three_factors(9);
    let study = |interaction| {
        study_with(
            &readings,
            &TWO_SIDED,
            &Settings {
                interaction,
                ..settings()
            },
        )
    };
    let names = |study: &Study| -> Vec<String> {
        study
            .mean_squares
            .iter()
            .map(|l| l.name.to_string())
            .collect()
    };
    let kept = study(Interaction::Keep);
    assert_eq!(names(&kept).len(), 9);
    let all = study(Interaction::PoolAbove(0.0));
    assert_eq!(
        names(&all),
        [
            "part",
            "appraiser",
            "fixture",
            "appraiser × fixture",
            "within cells",
            "total"
        ]
    );
    assert!(!all.interaction.kept);
    // The other reading of one choice is the figure of the other.
    assert_eq!(
        kept.interaction.other_reading.unwrap().gauge_sd,
        all.figures.gauge.sd.estimate
    );
    assert_eq!(
        all.interaction.other_reading.unwrap().gauge_sd,
        kept.figures.gauge.sd.estimate
    );
    let none = study(Interaction::PoolAbove(1.0));
    assert_eq!(names(&none), names(&kept));
    let ss = |study: &Study| {
        study
            .mean_squares
            .iter()
            .rev()
            .skip(1)
            .map(|l| l.ss)
            .sum::<f64>()
    };
    assert!((ss(&all) - ss(&kept)).abs() < 1e-12 * ss(&kept));
}
