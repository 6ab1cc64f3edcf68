//! Interaction kept or pooled.

use restudy_engine::{Design, Factor, Interaction, Settings, Study};

use crate::invented::{Readings, three_factors};
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

/// 4 parts × 3 appraisers × 2 fixtures × 2 trials whose interaction of part and appraiser alone is more than luck.
fn one_interaction_of_three() -> Readings {
    let design = Design::new(vec![
        Factor::crossed("part", 4),
        Factor::crossed("appraiser", 3),
        Factor::crossed("fixture", 2),
    ])
    .unwrap();
    let reading = |cell: usize, l: usize| {
        let levels = design.levels_of(cell);
        let [i, j, k] = [levels[0], levels[1], levels[2]];
        let scatter =
            8 * (17 * i + 11 * j + 7 * k + 5 * l + 3 * i * k + l * j * k + 3 * i * l) % 13;
        (10 * i + 2 * j + 9 * (i * j % 3) + k + scatter) as f64
    };
    let (cells, values) = (0..design.cells())
        .flat_map(|cell| [0, 1].map(|l| (cell, reading(cell, l))))
        .unzip();
    Readings {
        design: design.clone(),
        cells,
        values,
    }
}

/// p by numpy 2 and scipy 1.17: least squares with and without the term, F of the difference against what is left.
#[test]
fn a_remark_names_the_terms_pooled_with_the_p_of_each() {
    let study = study_with(
        &one_interaction_of_three(),
        &TWO_SIDED,
        &Settings {
            interaction: Interaction::PoolAbove(0.25),
            ..settings()
        },
    );
    assert!(study.interaction.kept);
    let remark = study.remarks.iter().find(|r| r.kind == "terms pooled");
    let remark = remark.unwrap();
    let expected = [
        ("p of part × appraiser × fixture", 0.383_194_563_296_984_87),
        ("p of part × fixture", 0.870_840_067_797_977_3),
    ];
    assert_eq!(remark.figures.len(), expected.len());
    for (name, p) in expected {
        assert!(
            (remark.figures[name] / p - 1.0).abs() < 1e-11,
            "{name}: {remark:?}"
        );
    }
    assert!(
        remark.text.ends_with(
            "part × appraiser × fixture (p 0.383) and part × fixture (p 0.871), each with a p above 0.25 when it \
             was tested. Kept: part × appraiser."
        ),
        "{}",
        remark.text
    );
}

#[test]
fn no_remark_on_pooling_where_the_record_says_all() {
    for interaction in [Interaction::Keep, Interaction::PoolAbove(1.0)] {
        let readings = one_interaction_of_three();
        let settings = Settings {
            interaction,
            ..settings()
        };
        let study = study_with(&readings, &TWO_SIDED, &settings);
        assert!(study.remarks.iter().all(|r| r.kind != "terms pooled"));
    }
}
