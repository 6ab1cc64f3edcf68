//! The gauge without each of its causes: point values exact, limits evaluated in 40-digit arithmetic.

use restudy_engine::Figure;
use restudy_engine::ladder::Ladder;

use crate::check::{Check, compared};
use crate::data::{PART_APPRAISER, fixture, pooling, settings, values};

#[test]
pub(crate) fn every_rung_of_three_studies() {
    let reference = values!("ladder").as_array().unwrap();
    assert_eq!(reference.len(), 12);
    for expected in reference {
        let fixture = match compared(&expected["study"]).as_str().unwrap() {
            "a_aiag_10x3x3" => fixture!("a_aiag_10x3x3"),
            "b_mr_20x3x2" => fixture!("b_mr_20x3x2"),
            _ => fixture!("g_aiag_within_times_1_5"),
        };
        let change = compared(&expected["change"]).as_str().unwrap();
        for (confidence, level) in [(0.90, "0.90"), (0.95, "0.95")] {
            let study = fixture.study(PART_APPRAISER, &settings(confidence, 6.0));
            let ladder = Ladder::of(&study).unwrap();
            let rung = match change.strip_prefix("without ") {
                Some(name) => {
                    let place = study.components.iter().position(|c| c.name == name);
                    ladder.without(place.unwrap())
                }
                None => ladder.mean_of(2),
            };
            let mut check = Check::new(&format!("{} {change} {level}", fixture.name), 9.0);
            let squared = |x: Option<f64>| x.map(|x| x * x);
            check.digits(
                "estimate",
                squared(rung.sd.estimate),
                &expected["variance_estimate"],
            );
            check.digits("lower", squared(rung.sd.lower), &expected[level]["lower"]);
            check.digits("upper", squared(rung.sd.upper), &expected[level]["upper"]);
            let tolerance = fixture.tolerance();
            let width = tolerance.upper.unwrap() - tolerance.lower.unwrap();
            let share = |sd: Option<f64>| sd.unwrap() * 6.0 / width;
            let found = &rung.share_of_tolerance;
            check.number("share", found.estimate, share(rung.sd.estimate));
            check.number("share upper", found.upper, share(rung.sd.upper));
            check.finish(5);
        }
    }
}

/// Pooled, the gauge without appraisers is its repeatability, whose limits are exact.
#[test]
pub(crate) fn what_is_left_of_a_pooled_study() {
    let fixture = fixture!("a_aiag_10x3x3");
    let study = fixture.study(PART_APPRAISER, &pooling(settings(0.95, 6.0)));
    let ladder = Ladder::of(&study).unwrap();
    assert_eq!(ladder.steps().len(), 2);
    let (rung, repeats) = (ladder.without(1), &study.figures.repeatability);
    let numbers = |f: &Figure| [f.estimate, f.lower, f.upper, f.at_least].map(Option::unwrap);
    for (found, expected) in numbers(&rung.sd).iter().zip(numbers(&repeats.sd)) {
        assert!((found / expected - 1.0).abs() < 1e-12);
    }
    assert_eq!(rung.sd.interval, repeats.sd.interval);
}
