//! Data without spread: what cannot be worked out is absent and says why; no number is infinite or undefined.

use crate::check::Check;
use crate::data::{PART_APPRAISER, fixture, settings};

#[test]
pub(crate) fn identical_repeats_have_no_repeatability_of_their_own() {
    let fixture = fixture!("edge_equal_trials");
    let study = fixture.study(PART_APPRAISER, &settings(0.95, 6.0));
    let anova = &fixture.expected["anova"];
    let mut check = Check::new(fixture.name, 11.0);
    for (reference, name) in [
        ("part", "part"),
        ("appraiser", "appraiser"),
        ("interaction", "part × appraiser"),
        ("error", "within cells"),
    ] {
        let line = study.mean_squares.iter().find(|l| l.name == name).unwrap();
        check.digits(
            &format!("{name} ss"),
            Some(line.ss),
            &anova[reference]["ss"],
        );
        check.digits(&format!("{name} f"), line.f, &anova[reference]["f"]);
        check.digits(&format!("{name} p"), line.p, &anova[reference]["p"]);
    }
    let estimates = &fixture.expected["with_interaction"]["estimates"];
    check.digits(
        "gauge",
        study.figures.gauge.variance.estimate,
        &estimates["variance"]["gauge"]["truncated"],
    );
    check.digits(
        "part",
        study.figures.part.variance.estimate,
        &estimates["variance"]["part"]["truncated"],
    );
    check.digits(
        "p of the interaction",
        study.interaction.p,
        &fixture.expected["pooling"]["p_interaction"],
    );
    let other = study.interaction.other_reading.unwrap();
    check.digits(
        "gauge sd when pooled",
        other.gauge_sd,
        &fixture.expected["pooled"]["estimates"]["sd"]["gauge"],
    );
    let repeatability = &study.figures.repeatability.variance;
    check.same(
        "repeatability",
        (
            repeatability.estimate,
            repeatability.lower,
            repeatability.upper,
        ),
        (Some(0.0), None, None),
    );
    check.same("a reason", repeatability.why.is_some(), true);
    check.finish(18);
}

#[test]
pub(crate) fn equal_readings_have_no_shares() {
    let fixture = fixture!("edge_all_equal");
    let placed = fixture.placed(PART_APPRAISER);
    let tolerance = restudy_engine::Tolerance {
        lower: Some(25.0),
        upper: Some(26.0),
        one_sided: None,
    };
    let study = restudy_engine::analyse(
        &placed.design,
        &placed.cells,
        &placed.values,
        &tolerance,
        &settings(0.95, 6.0),
    )
    .unwrap();
    let mut check = Check::new(fixture.name, 11.0);
    for (reference, name) in [
        ("part", "part"),
        ("appraiser", "appraiser"),
        ("interaction", "part × appraiser"),
        ("error", "within cells"),
        ("total", "total"),
    ] {
        let line = study.mean_squares.iter().find(|l| l.name == name).unwrap();
        check.digits(
            &format!("{name} ss"),
            Some(line.ss),
            &fixture.expected["anova"][reference]["ss"],
        );
        check.same(&format!("{name} f and p"), (line.f, line.p), (None, None));
    }
    let f = &study.figures;
    for (name, spread) in [
        ("repeatability", &f.repeatability),
        ("reproducibility", &f.reproducibility),
        ("gauge", &f.gauge),
        ("part", &f.part),
        ("total", &f.total),
    ] {
        let v = &spread.variance;
        check.same(
            name,
            (v.estimate, v.lower, v.upper),
            (Some(0.0), Some(0.0), Some(0.0)),
        );
        for share in [&spread.share_of_tolerance, &spread.share_of_tv] {
            check.same(
                &format!("{name} share"),
                (share.estimate, share.why.is_some()),
                (None, true),
            );
        }
    }
    check.same(
        "ratio and ndc",
        (
            study.part_to_gauge.estimate,
            study.ndc.whole,
            study.ndc.estimate,
        ),
        (None, None, None),
    );
    check.digits(
        "grand mean",
        Some(study.grand_mean),
        &fixture.expected["grand_mean"],
    );
    check.finish(20);
}
