//! The designs and true variances under which coverage is counted.

use restudy_engine::{Design, Factor};

/// True variance of each line of the table of mean squares; a line without one has none.
pub(crate) type Variances = &'static [(&'static str, f64)];

/// One design with its trials, under several truths.
pub(crate) struct Case {
    pub(crate) name: &'static str,
    pub(crate) design: Design,
    pub(crate) trials: usize,
    pub(crate) truths: &'static [(&'static str, Variances)],
}

const TWO_FACTORS: &[(&str, Variances)] = &[
    (
        "S1 repeatability only",
        &[("part", 1.0), ("within cells", 0.09)],
    ),
    (
        "S2 mixed",
        &[
            ("part", 1.0),
            ("appraiser", 0.02),
            ("part × appraiser", 0.01),
            ("within cells", 0.04),
        ],
    ),
    (
        "S3 appraiser dominated",
        &[
            ("part", 1.0),
            ("appraiser", 0.20),
            ("part × appraiser", 0.02),
            ("within cells", 0.04),
        ],
    ),
    (
        "S4 poor gauge",
        &[
            ("part", 0.10),
            ("appraiser", 0.05),
            ("part × appraiser", 0.02),
            ("within cells", 0.10),
        ],
    ),
];

const NESTED: &[(&str, Variances)] = &[
    (
        "repeatability only",
        &[("part within appraiser", 1.0), ("within cells", 0.2)],
    ),
    (
        "mixed",
        &[
            ("appraiser", 0.15),
            ("part within appraiser", 1.0),
            ("within cells", 0.2),
        ],
    ),
    (
        "appraiser dominated",
        &[
            ("appraiser", 1.0),
            ("part within appraiser", 1.0),
            ("within cells", 0.2),
        ],
    ),
];

const THREE_FACTORS: &[(&str, Variances)] = &[
    (
        "repeatability only",
        &[("part", 1.0), ("within cells", 0.05)],
    ),
    (
        "mixed",
        &[
            ("part", 1.0),
            ("appraiser", 0.02),
            ("fixture", 0.01),
            ("part × appraiser", 0.01),
            ("part × fixture", 0.005),
            ("appraiser × fixture", 0.005),
            ("part × appraiser × fixture", 0.005),
            ("within cells", 0.03),
        ],
    ),
    (
        "appraiser dominated",
        &[
            ("part", 1.0),
            ("appraiser", 0.2),
            ("fixture", 0.02),
            ("part × appraiser", 0.02),
            ("part × fixture", 0.01),
            ("appraiser × fixture", 0.01),
            ("within cells", 0.03),
        ],
    ),
];

/// Every case, or the fault that keeps a design from being one.
pub(crate) fn cases() -> Result<Vec<Case>, restudy_engine::DesignError> {
    let mut cases = Vec::new();
    for (name, parts, appraisers, trials) in [
        ("10x3x3", 10, 3, 3),
        ("10x3x2", 10, 3, 2),
        ("20x3x2", 20, 3, 2),
        ("10x2x3", 10, 2, 3),
    ] {
        cases.push(Case {
            name,
            design: Design::new(vec![
                Factor::crossed("part", parts),
                Factor::crossed("appraiser", appraisers),
            ])?,
            trials,
            truths: TWO_FACTORS,
        });
    }
    cases.push(Case {
        name: "3x8x3, parts within appraisers",
        design: Design::new(vec![
            Factor::crossed("appraiser", 3),
            Factor::nested("part", 8, &["appraiser"]),
        ])?,
        trials: 3,
        truths: NESTED,
    });
    cases.push(Case {
        name: "8x3x2x2, with fixtures",
        design: Design::new(vec![
            Factor::crossed("part", 8),
            Factor::crossed("appraiser", 3),
            Factor::crossed("fixture", 2),
        ])?,
        trials: 2,
        truths: THREE_FACTORS,
    });
    Ok(cases)
}
