//! From an sd to its share: only by a named rule.

use restudy_engine::{Figure, OneSided, Process, Settings, Tolerance};

use crate::invented::crossed;
use crate::sound::{settings, study, study_with};

#[test]
fn tolerance_rules() {
    let readings = crossed(8, 10, 3, 3);
    let mean = study(&readings).grand_mean;
    let sd = study(&readings).figures.gauge.sd.estimate.unwrap();
    let share = |lower, upper, one_sided, process| {
        let tolerance = Tolerance {
            lower,
            upper,
            one_sided,
        };
        let study = study_with(
            &readings,
            &tolerance,
            &Settings {
                process,
                ..settings()
            },
        );
        let Figure { estimate, why, .. } = study.figures.gauge.share_of_tolerance;
        (
            study.tolerance_rule,
            estimate.map(|share| share / sd),
            why.map(|w| w.into_owned()),
        )
    };
    let process = Some(Process::Stated {
        mean: 10.0,
        sd: 1.0,
    });
    let close = |found: (&str, Option<f64>, Option<String>), rule: &str, per_sd: f64| {
        assert_eq!(found.0, rule);
        assert!(
            (found.1.unwrap() - per_sd).abs() < 1e-12 * per_sd,
            "{found:?}"
        );
    };
    close(
        share(Some(-40.0), Some(50.0), None, None),
        "two-sided",
        6.0 / 90.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::FromZero), None),
        "from zero",
        6.0 / 50.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::Width(20.0)), None),
        "width",
        6.0 / 20.0,
    );
    close(
        share(None, Some(50.0), Some(OneSided::ToProcessMean), process),
        "to process mean",
        3.0 / 40.0,
    );
    close(
        share(Some(-40.0), None, Some(OneSided::ToStudyMean), None),
        "to study mean",
        3.0 / (mean + 40.0),
    );
    for (found, rule) in [
        (share(None, None, None, None), "none"),
        (share(None, Some(50.0), None, None), "none"),
        (
            share(None, Some(50.0), Some(OneSided::ToProcessMean), None),
            "to process mean",
        ),
        (
            share(None, Some(5.0), Some(OneSided::ToProcessMean), process),
            "to process mean",
        ),
        (
            share(None, Some(0.0), Some(OneSided::FromZero), None),
            "from zero",
        ),
        (share(Some(1.0), Some(1.0), None, None), "two-sided"),
    ] {
        assert_eq!((found.0, found.1), (rule, None));
        assert!(found.2.is_some());
    }
}
