//! What a message must not say: more than the judged figure, the limits and the design tell.

use restudy_config::Config;
use restudy_engine::{Interaction, Judge, Standing};

use super::bench::{Reads, halden, reads, round};
use super::{line, mail, middling, shifted, standings};
use crate::analyse::worked::Worked;
use crate::notice::Message;

fn judging(judge: Judge) -> Config {
    let mut config = halden();
    config.plans[0].judge = judge;
    config
}

fn share(worked: &Worked) -> &restudy_engine::Figure {
    let record = worked.outcomes[0].study.as_ref().unwrap();
    &record.study.figures.gauge.share_of_tolerance
}

/// 44 % and 53 % of the tolerance, all of it repeats.
fn wild() -> [Reads; 2] {
    [reads("bore A", 2.0, 0.0), reads("bore B", 2.4, 0.0)]
}

#[test]
fn a_share_that_is_back_by_its_lower_limit_names_that_limit() {
    let config = judging(Judge::Chance(0.9));
    let act = round(&config, 1, &wild(), None);
    assert_eq!(standings(&act), [Standing::Act; 2]);
    let now = [shifted("bore A"), reads("bore B", 1.6, 0.0)];
    let worked = round(&config, 2, &now, Some(&act));
    assert_eq!(standings(&worked), [Standing::Watch, Standing::Act]);
    let message = mail(&config, &worked);
    assert_eq!(
        message.subject,
        "BACK: impeller hub / bridge-1: bore A at \"watch\", estimate 36 % of tolerance (was 44 %)"
    );
    let first = line(&message, "Bore A has left \"act\": ");
    let judged = "the judged figure, what the share is above with 90 % confidence, is ";
    assert!(first.contains(judged), "{first}");
    let needed = ", below the 25.5 % needed to come back (0.85 × 30 %). The estimate is 36 % (was 44 %). Now";
    assert!(first.contains(needed), "{first}");
    assert!(
        line(&message, "How sure: ").ends_with("75 % that the true share is still above 30 %."),
        "{}",
        message.text
    );
    assert!(
        line(&message, "Next: ")
            .starts_with("Next: the estimate still lies above 30 %: finish what was begun"),
        "{}",
        message.text
    );
    let ranked = line(&message, "  - bore B: act as before");
    assert!(
        ranked.contains(", held, as the judged figure is not below 0.85 × 30 %"),
        "{ranked}"
    );
    let also = line(&message, "Also: ");
    assert!(
        also.contains(&format!("Bore B is held: {judged}2")),
        "{also}"
    );
    assert!(
        also.contains(" %: under 30 %, not yet under 25.5 %, so it stays at act"),
        "{also}"
    );
}

#[test]
fn a_share_that_is_back_by_its_upper_limit_names_that_limit() {
    let config = judging(Judge::Upper);
    let act = round(&config, 1, &[shifted("bore A")], None);
    let worked = round(&config, 2, &[reads("bore A", 0.6, 0.0)], Some(&act));
    let message = mail(&config, &worked);
    let first = line(&message, "Bore A has left ");
    let told = format!(
        "the judged figure, the upper limit of the share, is {:.0} %, below the 25.5 % needed",
        (100.0 * share(&worked).upper.unwrap()).ceil()
    );
    assert!(first.contains(&told), "{first}");
    assert!(!message.text.contains("nothing to do"), "{}", message.text);
}

#[test]
fn the_confidence_is_told_as_it_was_set() {
    for (set, told) in [
        (0.975, "97.5 % that it is above"),
        (0.995, "99.5 % that it is above"),
    ] {
        let mut config = halden();
        config.plans[0].confidence = set;
        let message = mail(&config, &round(&config, 1, &[shifted("bore A")], None));
        assert!(
            line(&message, "How sure: ").contains(told),
            "{}",
            message.text
        );
    }
}

#[test]
fn a_lower_limit_is_rounded_down() {
    let config = halden();
    let worked = round(&config, 1, &[shifted("bore A"), shifted("bore B")], None);
    let least = 100.0 * share(&worked).at_least.unwrap();
    assert!(least.fract() > 0.5, "{least}");
    let message = mail(&config, &worked);
    let told = format!("95 % that it is above {:.0} %", least.floor());
    assert!(
        line(&message, "How sure: ").contains(&told),
        "{}",
        message.text
    );
    let told = format!("(first study), at least {:.0} %", least.floor());
    assert!(
        line(&message, "  - bore A").contains(&told),
        "{}",
        message.text
    );
}

#[test]
fn an_upper_limit_below_the_whole_tolerance_is_told_and_rounded_up() {
    let config = halden();
    let worked = round(&config, 1, &[reads("bore A", 1.4, 0.6)], None);
    let (estimate, upper) = (
        share(&worked).estimate.unwrap(),
        share(&worked).upper.unwrap(),
    );
    assert!(upper > 1.5 * estimate && upper < 1.0, "{estimate} {upper}");
    let told = format!("Two-sided, 95 %: at most {:.0} %.", (100.0 * upper).ceil());
    let message = mail(&config, &worked);
    assert!(
        line(&message, "How sure: ").ends_with(&told),
        "{}",
        message.text
    );
}

/// One trial; loading TS reads 2.4 µm high and low in turn: the mean square within cells is 38.4 / 18 µm².
fn one_trial() -> (Config, Message) {
    let mut config = halden();
    config.plans[0].trials = 1;
    let turns = Reads {
        crossed: [0.0, 0.0, 0.0024],
        ..reads("bore A", 0.8, 0.0)
    };
    let worked = round(&config, 1, &[turns], None);
    let message = mail(&config, &worked);
    (config, message)
}

#[test]
fn one_trial_is_not_told_as_repeats() {
    let (_, message) = one_trial();
    assert!(
        message.subject.ends_with("bore A takes 32 % of tolerance"),
        "{}",
        message.subject
    );
    assert_eq!(
        line(&message, "Why: "),
        "Why: Repeatability with part × loading makes 100 % of the gauge's variance; one trial does not tell them apart."
    );
    assert!(
        line(&message, "Next: ").starts_with(
            "Next: repeat the whole round with two trials or more: only they tell repeatability from part × loading."
        ),
        "{}",
        message.text
    );
    assert_eq!(
        line(&message, "With one trial "),
        "With one trial part × loading cannot be told from repeatability: the line within cells holds both."
    );
}

#[test]
fn repeatability_is_compared_only_between_rounds_that_tell_it_alike() {
    let keeping = halden();
    let mut pooling = halden();
    pooling.plans[0].interaction = Interaction::PoolAbove(0.25);
    let mut once = halden();
    once.plans[0].trials = 1;
    for (first, second, compared) in [
        (&keeping, &keeping, true),
        (&pooling, &pooling, true),
        (&keeping, &pooling, false),
        (&pooling, &keeping, false),
        (&once, &keeping, false),
    ] {
        let before = round(first, 1, &[middling("bore A")], None);
        let up = mail(
            second,
            &round(second, 2, &[shifted("bore A")], Some(&before)),
        );
        assert_eq!(
            line(&up, "Why: ").contains("Repeatability: "),
            compared,
            "{}",
            up.text
        );
    }
    let act = round(&keeping, 1, &[reads("bore A", 2.0, 0.0)], None);
    let back = mail(
        &pooling,
        &round(&pooling, 2, &[middling("bore A")], Some(&act)),
    );
    assert_eq!(
        line(&back, "What changed: "),
        "What changed: the records do not tell."
    );
}
