//! Thin and flat data: remarks have finite figures, and nothing panics.

use restudy_engine::{Context, Design, Factor, OneSided, Remark, Tolerance, analyse, remarks};

use crate::invented::{Chance, Plant, REPEATABILITY_ALONE, kinds, settings, two_sided};

fn is_sound(remarks: &[Remark]) {
    for remark in remarks {
        assert!(remark.figures.values().all(|x| x.is_finite()), "{remark:?}");
        for sign in ["NaN", "inf"] {
            assert!(!remark.text.contains(sign), "{remark:?}");
        }
        assert!(remark.text.ends_with('.'), "{remark:?}");
    }
}

fn tolerances() -> [Tolerance; 4] {
    let one_sided = Tolerance {
        lower: None,
        upper: Some(0.0),
        one_sided: Some(OneSided::FromZero),
    };
    [
        Tolerance::default(),
        two_sided(400.0, 600.0),
        two_sided(600.0, 400.0),
        one_sided,
    ]
}

#[test]
fn every_small_shape_and_flat_readings() {
    for shape in [
        [2, 1, 1],
        [2, 1, 2],
        [2, 2, 1],
        [2, 2, 2],
        [2, 3, 2],
        [3, 2, 1],
        [3, 3, 3],
        [10, 1, 3],
        [10, 3, 1],
    ] {
        let study = Plant::new(1, shape, REPEATABILITY_ALONE);
        let flat = |f: &dyn Fn(usize) -> f64| {
            let mut flat = study.clone();
            flat.values = (0..study.values.len()).map(f).collect();
            flat
        };
        let cells = &study.cells;
        let levels = study.appraisers;
        let variants = [
            study.clone(),
            study.clone().rounded(1.0),
            flat(&|_| 25.4),
            flat(&|row| (cells[row] / levels) as f64 * 0.1 + 50.0),
            flat(&|row| (cells[row] / levels) as f64 * 0.1 + (cells[row] % levels) as f64 * 0.3),
            flat(&|row| cells[row] as f64 * 0.1),
            flat(&|row| f64::from(row == 0)),
            flat(&|row| 1e12 + row as f64 * 0.001),
        ];
        for variant in &variants {
            for tolerance in tolerances() {
                is_sound(&variant.remarks(&tolerance));
            }
        }
    }
}

#[test]
fn one_value_everywhere_is_said_to_be_too_coarse() {
    let mut study = Plant::new(1, [10, 3, 3], REPEATABILITY_ALONE);
    study.values.iter_mut().for_each(|y| *y = 25.4);
    let remarks = study.remarks(&Tolerance::default());
    assert_eq!(kinds(&remarks), ["coarse steps"]);
    assert!(
        remarks[0].text.contains("only 1 different value:"),
        "{}",
        remarks[0].text
    );
}

#[test]
fn repeats_without_any_spread_are_copies() {
    let mut study = Plant::new(2, [10, 3, 3], REPEATABILITY_ALONE).rounded(0.01);
    for row in 0..study.values.len() {
        study.values[row] = study.values[row / 3 * 3];
    }
    let remarks = study.remarks(&Tolerance::default());
    assert_eq!(remarks[0].kind, "identical repeats");
    assert!(
        remarks[0].text.starts_with("In 30 of 30 cells"),
        "{}",
        remarks[0].text
    );
}

#[test]
fn nested_and_further_factors_without_names_or_times() {
    let designs = [
        vec![
            Factor::crossed("appraiser", 3),
            Factor::nested("part", 8, &["appraiser"]),
        ],
        vec![
            Factor::crossed("part", 6),
            Factor::crossed("appraiser", 3),
            Factor::crossed("fixture", 2),
        ],
        vec![Factor::crossed("part", 12)],
    ];
    for factors in designs {
        let design = Design::new(factors).unwrap();
        let mut chance = Chance(3);
        let rows = 0..design.cells() * 2;
        let cells: Vec<usize> = rows.clone().map(|row| row / 2).collect();
        let mut values: Vec<f64> = rows.map(|_| chance.normal()).collect();
        values[3] += 25.0;
        let tolerance = two_sided(-3.0, 3.0);
        let study = analyse(&design, &cells, &values, &tolerance, &settings()).unwrap();
        // Lists of another length belong to other readings.
        let other = Context {
            taken: vec![Some(1.0); 5],
            trials: vec![0; 7],
            ..Context::default()
        };
        for context in [Context::default(), other] {
            let found = remarks(&design, &cells, &values, &study, &tolerance, &context);
            is_sound(&found);
            let kinds = kinds(&found);
            assert!(kinds.contains(&"spread of a cell"), "{kinds:?}");
        }
        let foreign = remarks(
            &design,
            &cells,
            &values[1..],
            &study,
            &tolerance,
            &Context::default(),
        );
        assert_eq!(foreign, study.remarks);
    }
}

#[test]
fn missing_readings_leave_what_needs_no_balance() {
    let mut study = Plant::new(3, [10, 3, 3], REPEATABILITY_ALONE);
    for row in [40, 17, 16, 15] {
        study.cells.remove(row);
        study.slots.remove(row);
        study.taken.remove(row);
        study.values.remove(row);
    }
    for (value, taken) in study.values.iter_mut().zip(&study.taken) {
        *value += 0.0005 * taken;
    }
    let design = study.design();
    let tolerance = two_sided(475.0, 525.0);
    let worked_out = analyse(
        &design,
        &study.cells,
        &study.values,
        &tolerance,
        &settings(),
    )
    .unwrap();
    let context = Context {
        taken: study.taken.iter().map(|&t| Some(t)).collect(),
        trials: study.slots.clone(),
        ..Context::default()
    };
    let found = remarks(
        &design,
        &study.cells,
        &study.values,
        &worked_out,
        &tolerance,
        &context,
    );
    is_sound(&found);
    assert!(kinds(&found).contains(&"drift"), "{found:#?}");
}
