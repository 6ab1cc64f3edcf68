//! One appraiser, one trial, few levels, readings without spread.

use restudy_engine::{Factor, Interaction, Judge, Settings};

use crate::invented::{crossed, simulated};
use crate::sound::{TWO_SIDED, settings, study, study_with};

#[test]
fn one_appraiser_leaves_reproducibility_open_and_judges_by_repeatability() {
    let study = study(&crossed(2, 8, 1, 3));
    assert!(study.figures.reproducibility.variance.estimate.is_none());
    assert_eq!(
        study.figures.gauge.variance,
        study.figures.repeatability.variance
    );
    assert!(study.judged_share.is_some());
    assert!(study.interaction.other_reading.is_none());
    assert_eq!(study.mean_squares.len(), 3);
}

#[test]
fn one_trial_says_what_the_error_holds() {
    let study = study(&crossed(3, 8, 3, 1));
    let names: Vec<&str> = study.mean_squares.iter().map(|l| l.name.as_ref()).collect();
    assert_eq!(names, ["part", "appraiser", "within cells", "total"]);
    assert!(
        study
            .remarks
            .iter()
            .any(|r| r.kind == "one trial" && r.text.contains("part × appraiser"))
    );
    assert!(!study.interaction.kept);
}

#[test]
fn one_trial_of_parts_alone_tells_nothing_but_the_total() {
    let study = study(&simulated(4, vec![Factor::crossed("part", 8)], 1));
    let f = &study.figures;
    for spread in [&f.repeatability, &f.gauge, &f.part] {
        assert!(spread.variance.estimate.is_none() && spread.variance.why.is_some());
    }
    assert!(f.total.variance.estimate.is_some());
    assert_eq!(
        (study.judged_share, study.ndc.whole, study.chance_above.act),
        (None, None, None)
    );
}

#[test]
fn one_trial_of_parts_nested_in_appraisers_still_shows_the_appraisers() {
    let factors = vec![
        Factor::crossed("appraiser", 3),
        Factor::nested("part", 5, &["appraiser"]),
    ];
    let study = study(&simulated(5, factors, 1));
    assert!(study.figures.gauge.variance.estimate.is_none());
    assert!(study.figures.reproducibility.variance.estimate.is_some());
}

#[test]
fn thin_and_flat_data_give_defined_answers() {
    let pooled = Settings {
        interaction: Interaction::PoolAbove(0.25),
        judge: Judge::Chance(0.9),
        ..settings()
    };
    for (parts, appraisers, trials) in [
        (2, 2, 2),
        (2, 2, 1),
        (2, 1, 2),
        (2, 1, 1),
        (10, 2, 3),
        (3, 3, 1),
        (2, 5, 2),
    ] {
        let readings = crossed(6, parts, appraisers, trials);
        let flat: [fn(&[usize]) -> f64; 5] = [
            |_| 25.4,
            |levels| levels[0] as f64 * 0.1,
            |levels| levels[1] as f64 * 0.1,
            |levels| 0.1 * levels[0] as f64 + 0.7 * levels[1] as f64,
            |levels| if levels[0] == levels[1] { 0.3 } else { 0.1 },
        ];
        for f in flat {
            let readings = readings.by_levels(f);
            study_with(&readings, &TWO_SIDED, &settings());
            study_with(&readings, &TWO_SIDED, &pooled);
        }
        for scale in [1e-130, 1e130] {
            study_with(&readings.mapped(|y| y * scale), &TWO_SIDED, &pooled);
        }
    }
}

#[test]
fn additive_readings_have_no_error_and_no_f_of_rounding() {
    let additive = |levels: &[usize]| 0.1 * levels[0] as f64 + 0.7 * levels[1] as f64;
    let readings = crossed(7, 5, 3, 2).by_levels(additive);
    let study = study(&readings);
    assert!(study.mean_squares.iter().all(|line| line.f.is_none()));
    assert_eq!(study.figures.repeatability.variance.estimate, Some(0.0));
}

/// What each kind of thin or flat data lacks is said in a sentence, and what it shows is a number.
#[test]
fn every_degenerate_study_says_what_it_lacks() {
    let flat = study(&crossed(8, 5, 3, 2).by_levels(|_| 25.4));
    let gauge = &flat.figures.gauge;
    assert_eq!(gauge.variance.estimate, Some(0.0));
    assert!(gauge.share_of_tolerance.why.is_some() && flat.part_to_gauge.why.is_some());

    let exact_repeats = study(&crossed(9, 5, 3, 2).by_levels(|l| (l[0] * 3 + l[1] * l[1]) as f64));
    let repeats = &exact_repeats.figures.repeatability.variance;
    assert_eq!((repeats.estimate, repeats.lower), (Some(0.0), None));
    assert!(repeats.why.is_some());
    assert!(
        exact_repeats
            .figures
            .gauge
            .share_of_tolerance
            .upper
            .is_some()
    );

    let one_appraiser = study(&crossed(10, 5, 1, 2));
    assert!(one_appraiser.figures.reproducibility.variance.why.is_some());
    assert!(one_appraiser.figures.gauge.variance.upper.is_some());

    let one_trial = study(&crossed(11, 5, 3, 1));
    assert!(one_trial.remarks.iter().any(|r| r.kind == "one trial"));
    assert!(one_trial.figures.gauge.variance.upper.is_some());

    let two_parts = study(&crossed(12, 2, 3, 2));
    let part = &two_parts.figures.part.variance;
    assert!(part.estimate.is_some() && part.lower.is_some());
    assert_eq!(part.upper.is_none(), part.open.is_some());
}
