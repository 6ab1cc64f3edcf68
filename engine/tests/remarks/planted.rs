//! One fault at a time: it is named, by cell, with its figures.

use restudy_engine::{OneSided, Remark, Tolerance};

use crate::invented::{Chance, PACE, Plant, REPEATABILITY_ALONE, Truth, kinds, two_sided};

const SHAPE: [usize; 3] = [10, 3, 3];

fn sound(seed: u64) -> Plant {
    Plant::new(seed, SHAPE, REPEATABILITY_ALONE).rounded(0.01)
}

/// Wide enough for all parts to span most of it.
fn tolerance() -> Tolerance {
    two_sided(475.0, 525.0)
}

fn the<'a>(remarks: &'a [Remark], kind: &str) -> &'a Remark {
    let found = remarks.iter().find(|r| r.kind == kind);
    found.unwrap_or_else(|| panic!("no `{kind}` in {remarks:#?}"))
}

/// The seeds from 1 to 20 whose study is without any remark, so that what is planted stands alone.
fn plain_seeds() -> Vec<u64> {
    let plain: Vec<u64> = (1..=20)
        .filter(|&seed| sound(seed).remarks(&tolerance()).is_empty())
        .collect();
    assert!(plain.len() >= 10, "{plain:?}");
    plain
}

/// Plants a fault into every plain study; it must be found in all but one of them, first and alone.
fn found(kind: &str, plant: impl Fn(&mut Plant), named: &[&str]) {
    let seeds = plain_seeds();
    let mut missed = Vec::new();
    for &seed in &seeds {
        let mut study = sound(seed);
        plant(&mut study);
        let remarks = study.remarks(&tolerance());
        match remarks.first() {
            Some(first) if first.kind == kind && named.iter().all(|n| first.text.contains(n)) => {
                assert!(first.figures.values().all(|x| x.is_finite()));
            }
            _ => missed.push((seed, kinds(&remarks))),
        }
    }
    assert!(missed.len() <= 1, "{kind}: {missed:?} of {seeds:?}");
}

#[test]
fn a_cell_that_repeats_badly() {
    let slip = |study: &mut Plant| {
        let row = study.row(2, 1, 1);
        study.values[row] += 12.0;
    };
    found(
        "spread of a cell",
        slip,
        &["P03 MO", "range-chart limit", "µm"],
    );
}

#[test]
fn a_cell_that_is_off() {
    let off = |study: &mut Plant| {
        for trial in 0..3 {
            let row = study.row(6, 2, trial);
            study.values[row] -= 8.0;
        }
    };
    found(
        "mean of a cell",
        off,
        &["P07 TS lies", "below", "of P07 and of TS"],
    );
}

#[test]
fn an_appraiser_who_repeats_worse() {
    let worse = |study: &mut Plant| {
        let mut chance = Chance(99);
        for part in 0..10 {
            for trial in 0..3 {
                let row = study.row(part, 0, trial);
                study.values[row] += 2.5 * chance.normal();
            }
        }
    };
    found(
        "repeatability of a level",
        worse,
        &["KL repeats worse than the others"],
    );
}

#[test]
fn an_appraiser_who_reads_high() {
    let high = |study: &mut Plant| {
        for part in 0..10 {
            for trial in 0..3 {
                let row = study.row(part, 2, trial);
                study.values[row] += 2.0;
            }
        }
    };
    found(
        "offset of a level",
        high,
        &["TS reads", "above KL and MO", "95 % limits"],
    );
}

/// Limits that hold for all three appraisers at once: 1 - 0.025 / 3 of Student's t with 18 df, scipy 1.17.1
/// (`stats.t.isf`); the difference of one mean of 30 readings from one of 60 has the variance MS / 30 + MS / 60.
#[test]
fn limits_of_the_largest_offset_allow_for_the_choice() {
    const T: f64 = 2.639_144_819_415_992;
    let mut plant = Plant::new(3, SHAPE, REPEATABILITY_ALONE);
    for (part, trial) in (0..10).flat_map(|part| (0..3).map(move |trial| (part, trial))) {
        let row = plant.row(part, 2, trial);
        plant.values[row] += 2.0;
    }
    let study = plant
        .prepared()
        .study(&plant.cells, &plant.values, &tolerance())
        .unwrap();
    let interaction = study.mean_squares.iter().find(|l| l.of.len() == 2);
    let reach = T * (interaction.and_then(|l| l.ms).unwrap() / 20.0).sqrt();
    let remarks = plant.remarks(&tolerance());
    let figures = &the(&remarks, "offset of a level").figures;
    let found = (figures["upper"] - figures["lower"]) / 2.0;
    assert!((found / reach - 1.0).abs() < 1e-10, "{found} {reach}");
}

#[test]
fn two_runs_exchanged() {
    for seed in plain_seeds() {
        let mut study = sound(seed);
        let (a, b) = (study.row(2, 1, 1), study.row(6, 1, 1));
        let apart = (study.values[a] - study.values[b]).abs();
        study.values.swap(a, b);
        let remarks = study.remarks(&tolerance());
        if apart < 8.0 {
            continue;
        }
        let text = &the(&remarks, "parts exchanged").text;
        assert!(
            text.starts_with(
                "P03 MO trial 2 and P07 MO trial 2 look exchanged: each reads like the other part."
            ),
            "{text}"
        );
        let figures = &remarks[0].figures;
        let after = sound(seed).prepared();
        let sound = sound(seed);
        let whole = after
            .study(&sound.cells, &sound.values, &tolerance())
            .unwrap();
        let share = whole.figures.gauge.share_of_tolerance.estimate.unwrap();
        assert!((figures["share after"] - share).abs() < 1e-9 * share);
        assert!(figures["share before"] > share);
        assert!(
            !kinds(&remarks).contains(&"spread of a cell"),
            "{remarks:#?}"
        );
    }
}

#[test]
fn two_parts_exchanged_by_one_appraiser() {
    let mut seen = 0;
    for seed in plain_seeds() {
        let mut study = sound(seed);
        let apart = (study.values[study.row(0, 0, 0)] - study.values[study.row(4, 0, 0)]).abs();
        for trial in 0..3 {
            let (a, b) = (study.row(0, 2, trial), study.row(4, 2, trial));
            study.values.swap(a, b);
        }
        if apart < 8.0 {
            continue;
        }
        seen += 1;
        let remarks = study.remarks(&tolerance());
        let remark = the(&remarks, "parts exchanged");
        assert!(
            remark.text.starts_with("P01 TS and P05 TS look exchanged"),
            "{}",
            remark.text
        );
        assert!(remark.figures["share after"] < 0.5 * remark.figures["share before"]);
    }
    assert!(seen >= 5);
}

#[test]
fn a_wild_value_is_no_exchange() {
    for seed in plain_seeds() {
        let mut study = sound(seed);
        let row = study.row(4, 0, 2);
        study.values[row] += 60.0;
        let remarks = study.remarks(&tolerance());
        assert!(
            !kinds(&remarks).contains(&"parts exchanged"),
            "{remarks:#?}"
        );
        assert!(
            the(&remarks, "spread of a cell")
                .text
                .starts_with("P05 KL repeats")
        );
    }
}

#[test]
fn readings_that_drift() {
    let drift = |study: &mut Plant| {
        for (value, taken) in study.values.iter_mut().zip(&study.taken) {
            *value += 4.0 * taken / (90.0 * PACE);
        }
    };
    found("drift", drift, &["Repeats rise with time", "µm an hour"]);
}

#[test]
fn values_that_were_copied() {
    let copied = |study: &mut Plant| {
        for part in 0..5 {
            for trial in 1..3 {
                let (from, to) = (study.row(part, 1, 0), study.row(part, 1, trial));
                study.values[to] = study.values[from];
            }
        }
    };
    found(
        "identical repeats",
        copied,
        &["In 5 of 30 cells", "P01 MO", "copied"],
    );
}

#[test]
fn trials_back_to_back() {
    let by_cell = |study: &mut Plant| {
        for (row, taken) in study.taken.iter_mut().enumerate() {
            // Cell by cell, the cells in an order that mixes parts and appraisers.
            let cell = row / 3;
            *taken = ((cell * 7 % 30) * 3 + row % 3) as f64 * PACE;
        }
    };
    found(
        "back to back",
        by_cell,
        &["trials of one cell", "60 of 60", "part × loading"],
    );
    let by_part = |study: &mut Plant| {
        for (row, taken) in study.taken.iter_mut().enumerate() {
            *taken = row as f64 * PACE;
        }
    };
    found(
        "back to back",
        by_part,
        &["readings of one part", "80 of 80", "missing from the gauge"],
    );
}

#[test]
fn steps_too_coarse() {
    let coarse = |study: &mut Plant| {
        study
            .values
            .iter_mut()
            .for_each(|y| *y = (*y / 2.0).round() * 2.0);
    };
    found(
        "coarse steps",
        coarse,
        &["steps of 2.00 µm", "an sd of 0.577 µm"],
    );
    let few = |study: &mut Plant| {
        study
            .values
            .iter_mut()
            .for_each(|y| *y = if *y > 500.0 { 510.0 } else { 490.0 });
    };
    found("coarse steps", few, &["only 2 different values"]);
}

#[test]
fn parts_that_span_little() {
    for seed in plain_seeds() {
        let remarks = sound(seed).remarks(&two_sided(400.0, 600.0));
        assert_eq!(kinds(&remarks), ["narrow parts"]);
        assert!(remarks[0].figures["share of tolerance spanned"] < 0.5);
    }
}

#[test]
fn readings_near_a_natural_zero() {
    let mut study = sound(plain_seeds()[0]);
    let lowest = study.values.iter().copied().fold(f64::MAX, f64::min);
    study.values.iter_mut().for_each(|y| *y -= lowest);
    let from_zero = |rule| Tolerance {
        lower: None,
        upper: Some(30.0),
        one_sided: rule,
    };
    let remarks = study.remarks(&from_zero(Some(OneSided::FromZero)));
    assert!(the(&remarks, "near zero").figures["readings near zero"] >= 1.0);
    assert!(!kinds(&study.remarks(&from_zero(None))).contains(&"near zero"));
}

/// sd factors for 1 df at 95 %: 0.446 and 31.9, as the printed chi-square tables give them.
#[test]
fn two_levels_hardly_tell() {
    let remarks = Plant::new(3, [10, 2, 3], REPEATABILITY_ALONE).remarks(&Tolerance::default());
    let text = &the(&remarks, "too few levels").text;
    assert!(
        text.starts_with("2 levels of loading hardly tell"),
        "{text}"
    );
    assert!(text.contains("0.446 to 31.9 times"), "{text}");
}

#[test]
fn the_cells_behind_an_interaction() {
    let truth = Truth {
        interaction: 3.0,
        ..REPEATABILITY_ALONE
    };
    let remarks = Plant::new(5, SHAPE, truth).remarks(&tolerance());
    let remark = the(&remarks, "cells of the interaction");
    assert!(
        remark
            .text
            .starts_with("The interaction of part and loading is larger than luck gives (p "),
        "{}",
        remark.text
    );
    assert!(remark.figures["share of the sum of squares"] > 0.1);
}

#[test]
fn at_most_a_handful_and_order_of_rows_changes_nothing() {
    for seed in 1..=10 {
        let mut study = Plant::new(seed, [4, 2, 3], REPEATABILITY_ALONE).rounded(2.0);
        study.values[0] += 30.0;
        study.taken.sort_by(f64::total_cmp);
        let tolerance = two_sided(0.0, 1000.0);
        let remarks = study.remarks(&tolerance);
        assert!((2..=restudy_engine::REMARKS_MAX).contains(&remarks.len()));
        let shuffled = study.shuffled(seed).remarks(&tolerance);
        assert_eq!(kinds(&shuffled), kinds(&remarks));
        for (a, b) in remarks.iter().zip(&shuffled) {
            assert_eq!(a.text, b.text);
        }
    }
}
