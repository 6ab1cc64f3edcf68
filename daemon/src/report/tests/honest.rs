//! What a page must not say: more than the limits and the design tell.

use std::collections::BTreeMap;

use restudy_engine::Interaction;

use super::plant::{Drawn, Plant};
use super::{plain, rendered, rendered_with};
use crate::evidence::Factor;

fn alone(drawn: Drawn) -> Plant {
    Plant {
        drawn: vec![drawn],
        ..Plant::halden()
    }
}

/// A characteristic with limits 1 mm apart, whose readings are given.
fn wide() -> Drawn {
    Drawn {
        lower: Some(49.5),
        upper: Some(50.5),
        ..Drawn::named("wide")
    }
}

#[test]
fn lower_limits_are_rounded_down_everywhere() {
    let plant = alone(Plant::halden().drawn[0].clone());
    let worked = plant.worked();
    let record = worked.outcomes[0].study.as_ref().unwrap();
    let least = 100.0
        * record
            .study
            .figures
            .gauge
            .share_of_tolerance
            .at_least
            .unwrap();
    assert!(least.fract() > 0.5, "{least}");
    let page = plain(&rendered_with(&plant, &worked));
    let least = least.floor();
    for told in [
        format!("at least {least} %;"),
        format!("95 % that it is above {least} %"),
        format!("Solid: at least {least} %, with"),
    ] {
        assert!(page.contains(&told), "{told}\n{page}");
    }
}

#[test]
fn an_upper_limit_is_told_when_there_is_one() {
    let plant = alone(wide());
    let tilt = [0.0, 0.0, 0.02];
    let worked = plant.worked_with(&|levels, slot| {
        50.0 + 0.05 * levels[0] as f64 + tilt[levels[1]] + 0.04 * (slot as f64 - 1.0)
    });
    let record = worked.outcomes[0].study.as_ref().unwrap();
    let upper = record.study.figures.gauge.share_of_tolerance.upper.unwrap();
    let page = plain(&rendered_with(&plant, &worked));
    let told = format!("Two-sided, 95 %: at most {:.0} %.", (100.0 * upper).ceil());
    assert!(upper < 1.0 && page.contains(&told), "{upper}\n{page}");
}

#[test]
fn nobody_is_named_when_nobody_stands_out() {
    let plant = alone(wide());
    let worked = plant.worked_with(&|levels, slot| {
        50.0 + 0.05 * levels[0] as f64 + [-0.01, 0.0, 0.01][levels[1]] + 0.001 * (slot as f64 - 1.0)
    });
    let page = plain(&rendered_with(&plant, &worked));
    assert!(
        page.contains("loadings differ by 0.0200 mm, from KL (lowest) to TS (highest)"),
        "{page}"
    );
    assert!(!page.contains("KL reads") && !page.contains("TS reads"));
}

#[test]
fn one_trial_promises_no_repeats() {
    let plant = Plant {
        trials: 1,
        ..alone(Plant::halden().drawn[0].clone())
    };
    let page = plain(&rendered(&plant));
    assert!(!page.contains("measured twice") && !page.contains("measure each part twice"));
    assert!(
        !page.contains("always kept"),
        "the interaction is in the error"
    );
    assert!(page.contains("variance; one trial does not tell part × loading from repeatability."));
    assert!(
        page.contains(
            "One trial does not tell repeatability from part × loading; two or more would."
        )
    );
    assert!(
        page.contains("<th scope=\"row\">within cells (repeatability with part × loading)</th>")
    );
    assert!(page.contains("EV holds part × loading, which one trial does not tell from it"));
}

#[test]
fn a_p_is_not_printed_as_nothing() {
    let plant = alone(wide());
    let worked = plant.worked_with(&|levels, slot| {
        let turn = if levels[0].is_multiple_of(2) {
            0.01
        } else {
            -0.01
        };
        50.0 + 0.05 * levels[0] as f64 + turn * levels[1] as f64 + 0.001 * (slot as f64 - 1.0)
    });
    let page = plain(&rendered_with(&plant, &worked)).replace("&lt;", "<");
    assert!(
        page.contains("Interaction kept (p < 0.001): the plan always keeps it."),
        "{page}"
    );
}

/// Two fixtures made of four trials; part × loading differs, part × fixture and all three together hardly.
#[test]
fn a_partly_pooled_model_says_what_remains() {
    let mut plant = Plant {
        trials: 4,
        parts: 2,
        readers: vec!["KL".into(), "MO".into()],
        ..alone(wide())
    };
    plant.plan.interaction = Interaction::PoolAbove(0.25);
    let mut evidence = plant.evidence();
    evidence.trials = 2;
    evidence.factors.push(Factor {
        name: "fixture".into(),
        word: "seat".into(),
        levels: vec!["left".into(), "right".into()],
    });
    for run in &mut evidence.runs {
        let fixture = run.slot / 2;
        run.levels.push(fixture);
        run.cell = 2 * run.cell + fixture;
        run.slot %= 2;
    }
    let sign = |level: usize| if level == 0 { -1.0 } else { 1.0 };
    let feature = &mut evidence.features[0];
    for (i, run) in evidence.runs.iter().enumerate() {
        let [part, loading, seat] = [0, 1, 2].map(|f| sign(run.levels[f]));
        feature.cells[i] = run.cell;
        feature.values[i] = 50.0
            + 0.1 * part
            + 0.02 * part * loading
            + 0.0002 * part * seat
            + 0.0001 * part * loading * seat
            + 0.001 * sign(run.slot);
    }
    let worked = plant.work(evidence, BTreeMap::new());
    let page = plain(&rendered_with(&plant, &worked));
    let told = "Interaction partly pooled into repeatability: part × seat and part × loading × seat went into it, \
                part × loading remains in the table (p = 0.78 of part × loading × seat): the plan pools it when p is above 0.25.";
    assert!(page.contains(told), "{page}");
}
