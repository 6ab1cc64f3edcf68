//! Missing cells and unequal trials.

use restudy_engine::ladder::Ladder;
use restudy_engine::risk::{Judged, misclassification};
use restudy_engine::{
    Factor, Interaction, Interval, Judge, Limits, OneSided, Process, Reml, Settings, StudyError,
    Tolerance, analyse, reml,
};

use crate::invented::{Readings, crossed, simulated, three_factors};
use crate::sound::{TWO_SIDED, settings, study, study_with};

impl Readings {
    /// Without the rows whose numbers are given.
    fn lacking(&self, rows: &[usize]) -> Readings {
        self.kept(|row, _| !rows.contains(&row))
    }

    fn kept(&self, keep: impl Fn(usize, usize) -> bool) -> Readings {
        let rows = (0..self.cells.len()).filter(|&row| keep(row, self.cells[row]));
        let (cells, values) = rows.map(|row| (self.cells[row], self.values[row])).unzip();
        Readings {
            design: self.design.clone(),
            cells,
            values,
        }
    }
}

fn fitted(readings: &Readings) -> Reml {
    reml(&readings.design, &readings.cells, &readings.values, true).unwrap()
}

/// A cell empty, some with one or two of three trials.
fn unequal(seed: u64) -> Readings {
    crossed(seed, 8, 3, 3).lacking(&[12, 13, 14, 3, 25, 40, 41, 70])
}

fn near(found: &[f64], expected: &[f64], relative: f64) {
    assert_eq!(found.len(), expected.len());
    let largest = expected.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
    for (found, expected) in found.iter().zip(expected) {
        assert!(
            (found - expected).abs() <= relative * largest,
            "{found:e} for {expected:e}"
        );
    }
}

/// Where no component is cut, both methods solve the same equations (Searle, Casella & McCulloch, ch. 6).
#[test]
fn equal_cells_give_the_components_of_the_mean_squares() {
    let nested = vec![
        Factor::crossed("appraiser", 4),
        Factor::nested("part", 5, &["appraiser"]),
    ];
    let mut compared = 0;
    for seed in 20..40 {
        for readings in [
            crossed(seed, 9, 4, 3),
            three_factors(seed),
            simulated(seed, nested.clone(), 2),
            simulated(seed, vec![Factor::crossed("part", 12)], 3),
        ] {
            let components = study(&readings).components;
            if components.iter().any(|c| c.raw <= 0.0) {
                continue;
            }
            let expected: Vec<f64> = components.iter().map(|c| c.raw).collect();
            near(&fitted(&readings).estimates, &expected, 1e-10);
            compared += 1;
        }
    }
    assert!(compared > 40, "{compared}");
}

#[test]
fn a_component_at_zero_leaves_those_of_the_smaller_model() {
    let readings = unequal(3);
    let with = (0..40)
        .map(unequal)
        .find(|r| fitted(r).at_zero == ["part × appraiser"]);
    let with = with.unwrap_or(readings);
    let fit = fitted(&with);
    let without = reml(&with.design, &with.cells, &with.values, false).unwrap();
    assert_eq!(fit.at_zero, ["part × appraiser"]);
    let kept = [0, 1, 3].map(|i| fit.estimates[i]);
    near(&kept, &without.estimates, 1e-10);
    assert!(fit.score.unwrap()[2] <= 0.0);
    near(
        &[fit.log_likelihood.unwrap()],
        &[without.log_likelihood.unwrap()],
        1e-12,
    );
}

#[test]
fn order_names_offset_and_unit_change_nothing() {
    for seed in 1..6 {
        let readings = unequal(seed);
        let fit = fitted(&readings);
        assert_eq!(fitted(&readings.shuffled(7)), fit);
        near(
            &fitted(&readings.relabelled(8)).estimates,
            &fit.estimates,
            1e-11,
        );
        let shifted = fitted(&readings.mapped(|y| y + 4096.0));
        assert_eq!(
            (&shifted.estimates, &shifted.at_zero),
            (&fit.estimates, &fit.at_zero)
        );
        near(&[shifted.mean - 4096.0], &[fit.mean], 1e-9);
        let doubled = fitted(&readings.mapped(|y| y * 1024.0));
        let back: Vec<f64> = doubled.estimates.iter().map(|x| x / 1_048_576.0).collect();
        assert_eq!(back, fit.estimates);
        let inch = fitted(&readings.mapped(|y| y / 25.4));
        let back: Vec<f64> = inch.estimates.iter().map(|x| x * 25.4 * 25.4).collect();
        near(&back, &fit.estimates, 1e-11);
        let contrasts = (readings.values.len() - 1) as f64;
        near(
            &[inch.log_likelihood.unwrap()],
            &[fit.log_likelihood.unwrap() + contrasts * 25.4f64.ln()],
            1e-11,
        );
    }
}

/// Parts a million repeats apart: what lies within parts keeps its digits.
#[test]
fn distant_parts_cost_no_digits() {
    let readings = unequal(4);
    let apart = |readings: &Readings, distance: f64| Readings {
        values: readings
            .cells
            .iter()
            .zip(&readings.values)
            .map(|(&cell, y)| y + distance * readings.design.levels_of(cell)[0] as f64)
            .collect(),
        ..readings.clone()
    };
    let near_by = fitted(&apart(&readings, 1024.0));
    let far = fitted(&apart(&readings, 1_048_576.0));
    near(&far.estimates[1..], &near_by.estimates[1..], 1e-4);
    assert!(far.estimates[0] > 1e5 * near_by.estimates[0]);
}

#[test]
fn the_study_of_unequal_cells_is_whole() {
    let chance = 0.9;
    let judged = Settings {
        judge: Judge::Chance(chance),
        ..settings()
    };
    let readings = unequal(5);
    let study = study_with(&readings, &TWO_SIDED, &judged);
    assert_eq!((study.method, study.mean_squares.len()), ("reml", 0));
    let layout = &study.design;
    assert_eq!(
        (
            layout.trials,
            layout.readings,
            layout.missing,
            layout.balanced
        ),
        (3, 64, 8, false)
    );
    assert_eq!((study.draws, study.seed.is_some()), (Some(2000), true));
    assert!(study.remarks.iter().any(|r| r.kind == "readings missing"));
    assert!(study.interaction.p.is_some() && study.interaction.other_reading.is_some());
    let gauge = &study.figures.gauge.share_of_tolerance;
    let share = study.judged_share.unwrap();
    assert!(share < gauge.estimate.unwrap());

    // The limit that is judged has the chance that judges.
    let limits = Limits {
        watch: share,
        act: gauge.estimate.unwrap(),
        back_below: 0.85,
    };
    let at_limit = Settings {
        limits: Some(limits),
        ..judged
    };
    let again = study_with(&readings.shuffled(3), &TWO_SIDED, &at_limit);
    assert!((again.chance_above.watch.unwrap() - chance).abs() < 1e-9);
    let bootstrap = &again.reml.as_ref().unwrap().bootstrap;
    assert_eq!(bootstrap, &study.reml.as_ref().unwrap().bootstrap);
    let act = again.chance_above.act.unwrap();
    assert!(act > 0.3 && act < 0.9, "{act}");
}

/// An estimated mean widens the limits of a share of the distance to it; a stated process gives risks.
#[test]
fn a_share_of_the_distance_to_the_mean_and_the_risks() {
    let tolerance = Tolerance {
        lower: None,
        upper: Some(30.0),
        one_sided: Some(OneSided::ToStudyMean),
    };
    let process = Settings {
        process: Some(Process::Stated { mean: 5.0, sd: 8.0 }),
        ..settings()
    };
    let study = study_with(&unequal(5), &tolerance, &process);
    let gauge = &study.figures.gauge;
    assert_eq!(gauge.share_of_tolerance.interval, Some(Interval::Bootstrap));
    assert_eq!(
        gauge.share_of_tolerance,
        study
            .reml
            .as_ref()
            .unwrap()
            .bootstrap
            .as_ref()
            .unwrap()
            .share_of_tolerance
    );
    let share = 3.0 * gauge.sd.estimate.unwrap() / (30.0 - study.grand_mean);
    near(
        &[gauge.share_of_tolerance.estimate.unwrap()],
        &[share],
        1e-12,
    );

    let risk = study.risk.unwrap();
    let judged = Judged {
        mean: 5.0,
        part_sd: 8.0,
        gauge_sd: gauge.sd.estimate.unwrap(),
        lower: None,
        upper: Some(30.0),
    };
    let expected = misclassification(&judged).unwrap();
    assert_eq!(risk.producer.joint.estimate, Some(expected.producer_joint));
    assert_eq!(risk.consumer.joint.estimate, Some(expected.consumer_joint));
    assert!(risk.consumer.joint.lower.is_none() && risk.consumer.joint.why.is_some());
}

/// With repeats alone, `df × estimate / variance` is chi-square, and the bootstrap must find its limits.
#[test]
fn bootstrap_of_a_single_variance_finds_the_chi_square_limits() {
    let readings = simulated(6, vec![Factor::crossed("part", 12)], 6).lacking(&[0, 7]);
    let study = study(&readings);
    let figure = &study.reml.unwrap().bootstrap.unwrap().variance;
    // 12 parts, 70 readings: 58 degrees of freedom; 95 % factors from chi-square with 58 df.
    let (lower, upper) = (58.0 / 80.936, 58.0 / 38.844);
    let estimate = figure.estimate.unwrap();
    // Each percentile of 2,000 draws is uncertain by 3 % of the sd at most.
    assert!((figure.lower.unwrap() / estimate - lower).abs() < 0.05);
    assert!((figure.upper.unwrap() / estimate - upper).abs() < 0.09);
}

#[test]
fn thin_and_flat_unequal_data_give_defined_answers() {
    let readings = unequal(6);
    let flat = study(&readings.by_levels(|_| 25.4));
    assert_eq!(flat.figures.gauge.variance.estimate, Some(0.0));
    assert!(flat.judged_share.is_none() && flat.figures.gauge.share_of_tv.why.is_some());

    // Equal repeats: repeatability is zero, cells differ.
    let steps = |levels: &[usize]| (levels[0] * 7 % 5) as f64 + (levels[0] * levels[1] % 3) as f64;
    let equal = study(&readings.by_levels(steps));
    assert_eq!(equal.figures.repeatability.variance.estimate, Some(0.0));
    assert!(equal.figures.gauge.variance.estimate.unwrap() > 0.0);
    assert!(equal.figures.gauge.variance.lower.is_none());
    assert!(equal.reml.unwrap().reason.is_some());

    let additive = readings.by_levels(|levels| 0.1 * levels[0] as f64 + 0.7 * levels[1] as f64);
    assert_eq!(
        analyse(
            &additive.design,
            &additive.cells,
            &additive.values,
            &TWO_SIDED,
            &settings()
        ),
        Err(StudyError::NoError)
    );
    for scale in [1e-130, 1e130] {
        study(&readings.mapped(|y| y * scale));
    }
}

#[test]
fn one_trial_with_an_empty_cell_says_what_the_error_holds() {
    let study = study(&crossed(9, 6, 3, 1).lacking(&[4]));
    assert!(study.remarks.iter().any(|r| r.kind == "one trial"));
    assert!(study.interaction.other_reading.is_none());
    assert_eq!(study.components.len(), 3);
}

#[test]
fn what_the_present_cells_cannot_tell_apart_is_named() {
    let whole = crossed(7, 6, 3, 2);
    let refused = |readings: &Readings| {
        analyse(
            &readings.design,
            &readings.cells,
            &readings.values,
            &TWO_SIDED,
            &settings(),
        )
        .unwrap_err()
    };
    // Each part by one appraiser alone.
    let confounded = whole.kept(|_, cell| cell / 3 % 3 == cell % 3);
    let error = refused(&confounded);
    assert_eq!(error, StudyError::NotApart("part × appraiser".into()));
    assert_eq!(
        error.to_string(),
        "the cells that hold readings cannot tell the spread of part × appraiser from the others; \
         expected readings in more cells"
    );
    let one_appraiser = whole.kept(|_, cell| cell % 3 == 1);
    assert_eq!(
        refused(&one_appraiser),
        StudyError::NotApart("appraiser".into())
    );
    let one_part = whole.kept(|_, cell| cell / 3 == 2);
    assert_eq!(refused(&one_part), StudyError::NotApart("part".into()));
    let one_reading = whole.kept(|row, _| row == 0);
    assert!(matches!(refused(&one_reading), StudyError::NotApart(_)));
}

/// A reader of a study of unequal cells learns why figures lack limits, and which remarks could not have come.
#[test]
fn what_unequal_cells_leave_out_is_said() {
    let stated = Settings {
        process: Some(Process::Stated { mean: 0.0, sd: 9.0 }),
        ..settings()
    };
    let study = study_with(&unequal(5), &TWO_SIDED, &stated);
    let missing = study.remarks.iter().find(|r| r.kind == "readings missing");
    assert!(missing.unwrap().text.contains("were not looked for"));
    let risk = study.risk.as_ref().unwrap();
    let needs_equal = |why: &Option<std::borrow::Cow<'static, str>>| {
        why.as_ref()
            .is_some_and(|why| why.contains("need equal numbers of readings in all cells"))
    };
    assert!(risk.consumer.joint.estimate.is_some() && needs_equal(&risk.consumer.joint.why));
    let rungs = Ladder::of(&study).unwrap().steps();
    assert_eq!(rungs.len(), 3);
    for rung in rungs {
        assert!(
            rung.sd.lower.is_none() && needs_equal(&rung.sd.why),
            "{rung:?}"
        );
    }
}

/// The first p of the remark is that of the largest interaction; with a limit of 0 all are pooled and named.
#[test]
fn pooled_terms_of_unequal_cells_are_named() {
    let full = three_factors(9);
    let readings = Readings {
        cells: full.cells[1..].to_vec(),
        values: full.values[1..].to_vec(),
        ..full
    };
    let pooling = Settings {
        interaction: Interaction::PoolAbove(0.0),
        ..settings()
    };
    let study = study_with(&readings, &TWO_SIDED, &pooling);
    let remark = study.remarks.iter().find(|r| r.kind == "terms pooled");
    let remark = remark.unwrap();
    assert_eq!(remark.figures.len(), 3);
    assert_eq!(
        remark.figures["p of part × appraiser × fixture"],
        study.interaction.p.unwrap()
    );
    assert!(
        remark
            .text
            .ends_with("No interaction with the part is kept.")
    );
    let all = study_with(&readings, &TWO_SIDED, &settings());
    assert!(all.remarks.iter().all(|r| r.kind != "terms pooled"));
}
