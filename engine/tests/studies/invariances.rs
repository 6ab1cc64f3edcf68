//! What must not change a study, and what must hold within one.

use restudy_engine::quantile::chi_square_above;
use restudy_engine::{
    Factor, Interaction, Judge, Limits, OneSided, Process, Settings, Spread, Study, Tolerance,
};

use crate::invented::{Readings, crossed, simulated, three_factors};
use crate::sound::{TWO_SIDED, settings, study_with};

fn study(readings: &Readings, settings: &Settings) -> Study {
    study_with(readings, &TWO_SIDED, settings)
}

/// All numbers of a study that carry a unit to the power 0, 1 or 2, each with its power.
fn numbers(study: &Study) -> Vec<(f64, i32)> {
    let mut numbers = Vec::new();
    for line in &study.mean_squares {
        numbers.extend(
            [Some(line.ss), line.ms]
                .into_iter()
                .flatten()
                .map(|x| (x, 2)),
        );
        numbers.extend(
            [line.f, line.p, line.against_df]
                .into_iter()
                .flatten()
                .map(|x| (x, 0)),
        );
    }
    let f = &study.figures;
    for spread in [
        &f.repeatability,
        &f.reproducibility,
        &f.gauge,
        &f.part,
        &f.total,
    ] {
        for (figure, power) in [
            (&spread.variance, 2),
            (&spread.sd, 1),
            (&spread.share_of_tv, 0),
        ] {
            let limits = [figure.estimate, figure.lower, figure.upper, figure.at_least];
            numbers.extend(limits.into_iter().flatten().map(|x| (x, power)));
        }
    }
    let ratio = &study.part_to_gauge;
    numbers.extend(
        [ratio.estimate, ratio.lower, ratio.upper, study.ndc.estimate]
            .into_iter()
            .flatten()
            .map(|x| (x, 0)),
    );
    numbers
}

fn assert_scaled(before: &Study, after: &Study, scale: f64, tolerance: f64) {
    let (before, after) = (numbers(before), numbers(after));
    assert_eq!(before.len(), after.len());
    assert!(before.len() > 80);
    for ((x, power), (y, _)) in before.into_iter().zip(after) {
        let wanted = x * scale.powi(power);
        assert!(
            (y - wanted).abs() <= tolerance * wanted.abs(),
            "found {y:e}, expected {wanted:e}"
        );
    }
}

#[test]
fn the_order_of_rows_changes_not_one_bit() {
    for seed in 0..20 {
        let readings = if seed % 2 == 0 {
            crossed(seed, 7, 3, 3)
        } else {
            three_factors(seed)
        };
        let shuffled = readings.shuffled(seed + 1000);
        assert_ne!(readings.values, shuffled.values);
        assert_eq!(study(&readings, &settings()), study(&shuffled, &settings()));
    }
}

#[test]
fn other_labels_for_the_levels_change_nothing() {
    for seed in 0..20 {
        let readings = if seed % 2 == 0 {
            crossed(seed, 7, 3, 3)
        } else {
            three_factors(seed)
        };
        assert_scaled(
            &study(&readings, &settings()),
            &study(&readings.relabelled(seed + 1000), &settings()),
            1.0,
            1e-10,
        );
    }
}

#[test]
fn a_shift_changes_nothing_but_the_mean() {
    for seed in 0..20 {
        // The readings are multiples of 2⁻¹⁰, so that the shifted ones are exact.
        let readings = crossed(seed, 10, 3, 2);
        let before = study(&readings, &settings());
        for shift in [1e3, -5e6, 1e9] {
            let after = study(&readings.mapped(|y| y + shift), &settings());
            assert_scaled(&before, &after, 1.0, 1e-10);
            assert!((after.grand_mean - before.grand_mean - shift).abs() <= 1e-15 * shift.abs());
        }
    }
}

#[test]
fn inch_and_millimetre_give_the_same_study() {
    for seed in 0..20 {
        let readings = three_factors(seed);
        let before = study(&readings, &settings());
        for scale in [25.4, 1e-9, 1e9, 2f64.powi(-200), 2f64.powi(200)] {
            assert_scaled(
                &before,
                &study(&readings.mapped(|y| y * scale), &settings()),
                scale,
                1e-10,
            );
        }
    }
}

#[test]
fn variances_of_gauge_and_total_are_sums() {
    for seed in 0..40 {
        let readings = if seed % 2 == 0 {
            crossed(seed, 5, 2, 2)
        } else {
            three_factors(seed)
        };
        let interaction = if seed % 4 < 2 {
            Interaction::Keep
        } else {
            Interaction::PoolAbove(0.25)
        };
        let f = study(
            &readings,
            &Settings {
                interaction,
                ..settings()
            },
        )
        .figures;
        let square = |s: &Spread| s.sd.estimate.unwrap().powi(2);
        let (ev, av, grr, pv, tv) = (
            square(&f.repeatability),
            square(&f.reproducibility),
            square(&f.gauge),
            square(&f.part),
            square(&f.total),
        );
        assert!((ev + av - grr).abs() <= 1e-12 * grr);
        assert!((grr + pv - tv).abs() <= 1e-12 * tv);
    }
}

#[test]
fn the_chance_above_a_lower_limit_is_its_confidence() {
    for seed in 0..12 {
        let readings = if seed % 2 == 0 {
            crossed(seed, 10, 3, 3)
        } else {
            three_factors(seed)
        };
        for confidence in [0.7, 0.9, 0.95, 0.999] {
            let plain = study(
                &readings,
                &Settings {
                    confidence,
                    ..settings()
                },
            );
            let at_least = plain.figures.gauge.share_of_tolerance.at_least.unwrap();
            if at_least == 0.0 {
                continue;
            }
            let limits = Limits {
                watch: at_least,
                act: 1.5 * at_least,
                back_below: 0.85,
            };
            let judged = study(
                &readings,
                &Settings {
                    confidence,
                    limits: Some(limits),
                    judge: Judge::Chance(confidence),
                    ..settings()
                },
            );
            let watch = judged.chance_above.watch.unwrap();
            assert!(
                (watch - confidence).abs() < 1e-10,
                "chance {watch} at confidence {confidence}"
            );
            assert!(judged.chance_above.act.unwrap() < watch);
            let lower = judged.judged_share.unwrap();
            assert!((lower - at_least).abs() < 1e-12 * at_least);
        }
    }
}

/// With one factor the gauge is one mean square, and the chance is a chi-square probability.
#[test]
fn the_chance_of_a_single_mean_square_is_exact() {
    let readings = crossed(5, 10, 1, 3);
    for share in [0.05, 0.2, 0.25, 0.3, 0.5, 2.0] {
        let limits = Limits {
            watch: share,
            act: 1e9,
            back_below: 0.85,
        };
        let study = study(
            &readings,
            &Settings {
                limits: Some(limits),
                ..settings()
            },
        );
        let variance = study.figures.gauge.variance.estimate.unwrap();
        let df = study
            .mean_squares
            .iter()
            .find(|l| l.name == "within cells")
            .unwrap()
            .df as f64;
        let limit = (share * 60.0 / 6.0f64).powi(2);
        let exact = 1.0 - chi_square_above(df * variance / limit, df);
        assert!(
            (study.chance_above.watch.unwrap() - exact).abs() < 1e-9,
            "share {share}: exact {exact}"
        );
        assert!(study.chance_above.act.unwrap() < 1e-9);
    }
}

#[test]
fn the_judged_figure_follows_the_setting() {
    let readings = crossed(3, 10, 3, 3);
    let judged = |judge| {
        study(
            &readings,
            &Settings {
                judge,
                ..settings()
            },
        )
        .judged_share
        .unwrap()
    };
    let share = study(&readings, &settings())
        .figures
        .gauge
        .share_of_tolerance;
    assert_eq!(judged(Judge::Estimate), share.estimate.unwrap());
    assert_eq!(judged(Judge::Upper), share.upper.unwrap());
    assert!(judged(Judge::Chance(0.99)) < judged(Judge::Chance(0.8)));
}

/// The numbers of a study that carry no unit but hang on the tolerance.
fn of_tolerance(study: &Study) -> Vec<f64> {
    let f = &study.figures;
    let mut numbers = vec![study.chance_above.watch, study.chance_above.act];
    for spread in [
        &f.repeatability,
        &f.reproducibility,
        &f.gauge,
        &f.part,
        &f.total,
    ] {
        let share = &spread.share_of_tolerance;
        numbers.extend([share.estimate, share.lower, share.upper, share.at_least]);
    }
    let risk = study.risk.as_ref().unwrap();
    for risk in [
        &risk.producer.joint,
        &risk.producer.given_good,
        &risk.consumer.joint,
        &risk.consumer.given_bad,
    ] {
        numbers.push(risk.estimate);
    }
    numbers.into_iter().map(|x| x.unwrap_or(-1.0)).collect()
}

/// Readings and tolerance moved together, in millimetres or in inches: the same shares, chances and risks.
#[test]
fn tolerance_and_readings_in_another_unit_give_the_same_shares() {
    let settings = Settings {
        process: Some(Process::StudyParts),
        ..settings()
    };
    let nested = vec![
        Factor::crossed("appraiser", 3),
        Factor::nested("part", 6, &["appraiser"]),
    ];
    for readings in [crossed(31, 8, 3, 2), simulated(32, nested, 3)] {
        for one_sided in [false, true] {
            let at = |scale: f64, shift: f64| {
                let tolerance = Tolerance {
                    lower: (!one_sided).then_some(-30.0 * scale + shift),
                    upper: Some(30.0 * scale + shift),
                    one_sided: one_sided.then_some(OneSided::ToStudyMean),
                };
                let readings = readings.mapped(|y| y * scale + shift);
                of_tolerance(&study_with(&readings, &tolerance, &settings))
            };
            let before = at(1.0, 0.0);
            assert!(before.iter().filter(|x| **x >= 0.0).count() > 20);
            for (scale, shift) in [(1.0 / 25.4, 0.0), (25.4, 0.0), (1.0, 1024.0), (0.25, -64.0)] {
                for (x, y) in before.iter().zip(at(scale, shift)) {
                    assert!((x - y).abs() <= 1e-8 * x.abs(), "{x:e} became {y:e}");
                }
            }
        }
    }
}
