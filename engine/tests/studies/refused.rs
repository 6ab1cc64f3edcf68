//! Input that is refused, in one sentence.

use restudy_engine::{Design, DesignError, Factor, Prepared, Settings, StudyError, analyse};

use crate::invented::crossed;
use crate::sound::{TWO_SIDED, settings};

#[test]
fn faulty_input_is_refused_in_one_sentence() {
    let readings = crossed(11, 4, 3, 2);
    let refused = |cells: &[usize], values: &[f64], settings: &Settings| {
        analyse(&readings.design, cells, values, &TWO_SIDED, settings).unwrap_err()
    };
    let (cells, values) = (readings.cells.as_slice(), readings.values.as_slice());
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        let mut values = values.to_vec();
        values[3] = bad;
        // Unequal cells take another way to the same sentence.
        for kept in [values.len(), values.len() - 1] {
            assert!(matches!(
                refused(&cells[..kept], &values[..kept], &settings()),
                StudyError::NotFinite { row: 3, .. }
            ));
        }
    }
    assert!(matches!(
        refused(cells, &values[1..], &settings()),
        StudyError::Lengths { .. }
    ));
    assert_eq!(refused(&[], &[], &settings()), StudyError::Empty);
    let mut beyond = cells.to_vec();
    beyond[2] = 12;
    assert!(matches!(
        refused(&beyond, values, &settings()),
        StudyError::NoSuchCell {
            row: 2,
            cell: 12,
            last: 11
        }
    ));
    let huge: Vec<f64> = values.iter().map(|y| y * 1e300).collect();
    assert!(matches!(
        refused(cells, &huge, &settings()),
        StudyError::Spread(_)
    ));
    for confidence in [0.0, 0.4, 1.0, f64::NAN] {
        assert!(matches!(
            refused(
                cells,
                values,
                &Settings {
                    confidence,
                    ..settings()
                }
            ),
            StudyError::Setting { .. }
        ));
    }
    let one_part = crossed(12, 1, 3, 2);
    assert_eq!(
        analyse(
            &one_part.design,
            &one_part.cells,
            &one_part.values,
            &TWO_SIDED,
            &settings()
        )
        .unwrap_err(),
        StudyError::TooFewParts(1)
    );
    for (trials, error) in [
        (0, StudyError::Empty),
        (10_001, StudyError::TooManyTrials(10_001)),
    ] {
        assert_eq!(
            Prepared::new(&readings.design, trials, &settings()).unwrap_err(),
            error
        );
    }
    let prepared = Prepared::new(&readings.design, 3, &settings()).unwrap();
    let error = prepared.study(cells, values, &TWO_SIDED).unwrap_err();
    assert_eq!(
        error.to_string(),
        "cell 0 (part 1, appraiser 1) holds 2 readings; expected 3 as in the other cells"
    );
}

#[test]
fn faulty_designs_are_refused() {
    let refused = |factors: Vec<Factor>| Design::new(factors).unwrap_err();
    let part = || Factor::crossed("part", 3);
    assert_eq!(
        refused(vec![Factor::crossed("appraiser", 3)]),
        DesignError::NoPart
    );
    assert_eq!(
        refused(vec![part(), part()]),
        DesignError::SameName("part".into())
    );
    assert_eq!(
        refused(vec![part(), Factor::crossed("shift", 0)]),
        DesignError::NoLevels("shift".into())
    );
    assert_eq!(
        refused(vec![part(), Factor::crossed(" ", 2)]),
        DesignError::NoName(2)
    );
    assert!(matches!(
        refused(vec![part(), Factor::nested("shift", 2, &["plant"])]),
        DesignError::UnknownContainer { .. }
    ));
    let circle = vec![
        part(),
        Factor::nested("a", 2, &["b"]),
        Factor::nested("b", 2, &["a"]),
    ];
    assert!(matches!(refused(circle), DesignError::Circle(_)));
    assert_eq!(
        refused(vec![part(), Factor::crossed("a", usize::MAX)]),
        DesignError::TooManyCells
    );
    let many: Vec<Factor> = (0..6)
        .map(|i| Factor::crossed(&format!("f{i}"), 2))
        .chain([part()])
        .collect();
    assert_eq!(refused(many), DesignError::TooManyFactors(7));
}
