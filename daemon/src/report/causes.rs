//! What the gauge's spread would be without one of its causes, in the plant's words.
//!
//! Not here: the arithmetic, which is the engine's ladder. Each rung takes away one thing only.

use restudy_engine::{Figure, ladder};

use super::spread::Spread;
use super::subject::{Cause, Subject};
use super::unit::Unit;
use super::words::{list, percent};
use crate::plain::plural;

/// With more others than this, they are not listed by name.
const NAMED_MAX: usize = 3;

/// One rung: an sd that is, or would be.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Rung {
    pub(super) change: Change,
    /// In reading units.
    pub(super) sd: f64,
    /// Two-sided limits.
    pub(super) lower: Option<f64>,
    pub(super) upper: Option<f64>,
    /// Whether the data set no upper limit.
    pub(super) open: bool,
}

/// What is changed about the gauge.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Change {
    /// Nothing.
    AsItIs,
    /// One component left out; its term in the plant's words.
    Without(Cause, String),
    /// Each part loaded and measured twice, the mean counting.
    Twice,
}

/// The gauge as it is, and each change by itself.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Ladder {
    pub(super) now: Rung,
    pub(super) steps: Vec<Rung>,
    longest: Option<usize>,
}

impl Change {
    /// What stands beside the rung.
    pub(super) fn label(&self) -> String {
        match self {
            Change::AsItIs => "as it is now".to_owned(),
            Change::Without(Cause::Interaction, term) => format!("without {term} interaction"),
            Change::Without(_, term) => format!("without {term} differences"),
            Change::Twice => "loaded and measured twice".to_owned(),
        }
    }
}

impl Ladder {
    /// `None` when the gauge's spread is not known.
    pub(super) fn of(subject: Subject<'_>) -> Option<Ladder> {
        let ladder = ladder::Ladder::of(&subject.record.study)?;
        let longest = ladder.longest();
        let undivided = subject.undivided().is_some();
        let causes = subject
            .causes()
            .zip(ladder.steps())
            .filter(|((cause, _), _)| *cause != Cause::Repeats || !undivided);
        let steps: Vec<(ladder::Change, Rung)> = causes
            .filter_map(|((cause, component), step)| {
                let change = match step.change {
                    ladder::Change::MeanOf(_) => Change::Twice,
                    _ => Change::Without(cause, subject.term(&component.of, &component.within)),
                };
                Some((step.change, Rung::of(change, &step.sd)?))
            })
            .collect();
        Some(Ladder {
            now: Rung::of(Change::AsItIs, &ladder.now().sd)?,
            longest: longest.and_then(|l| steps.iter().position(|(change, _)| *change == l.change)),
            steps: steps.into_iter().map(|(_, rung)| rung).collect(),
        })
    }

    /// The longest step down; `None` when no change by itself brings the spread down.
    pub(super) fn longest(&self) -> Option<&Rung> {
        self.longest.and_then(|i| self.steps.get(i))
    }

    /// The longest step as advice, and what no step here can take away; `None` when there is neither.
    pub(super) fn advice(&self, subject: Subject<'_>, spread: &Spread) -> Option<String> {
        let one_trial = subject.undivided().map(|term| {
            format!("One trial does not tell repeatability from {term}; two or more would.")
        });
        let told: Vec<String> = [self.step(subject, spread), one_trial]
            .into_iter()
            .flatten()
            .collect();
        (!told.is_empty()).then(|| told.join(" "))
    }

    /// `None` when the step is too short to be seen in the numbers.
    fn step(&self, subject: Subject<'_>, spread: &Spread) -> Option<String> {
        let unit = subject.unit();
        let amount = |sd: f64| amount(sd, subject.share_per_sd(), &unit);
        let Some(step) = self.longest() else {
            return Some("None of these changes by itself brings it down.".to_owned());
        };
        let (to, from) = (amount(step.sd), amount(self.now.sd));
        if to == from {
            return None;
        }
        let from_to = format!("{to} instead of {from}");
        Some(match &step.change {
            Change::AsItIs | Change::Twice => format!(
                "The longest step down is to load and measure each part twice and take the mean, {from_to}: \
                 repeatability weighs most."
            ),
            Change::Without(Cause::Interaction, term) => format!(
                "The longest step down is without the {term} interaction, {from_to}: the differences change from part to part; \
                 find the parts on which they do."
            ),
            Change::Without(_, term) => format!(
                "The longest step down is without the {term} differences, {from_to}: {}.",
                who(term, subject, spread, &unit)
                    .unwrap_or_else(|| "find out what differs".to_owned())
            ),
        })
    }
}

impl Rung {
    fn of(change: Change, sd: &Figure) -> Option<Rung> {
        Some(Rung {
            change,
            sd: sd.estimate?,
            lower: sd.lower,
            upper: sd.upper,
            open: sd.open.is_some(),
        })
    }
}

/// An sd as a share of tolerance, or in its own unit where there is none.
pub(super) fn amount(sd: f64, share_per_sd: Option<f64>, unit: &Unit) -> String {
    match share_per_sd {
        Some(per_sd) => percent(per_sd * sd),
        None => unit.three_digits(sd),
    }
}

/// Who stands apart, by how much, and on how many parts: only where the pictures tell that factor's levels apart.
fn who(term: &str, subject: Subject<'_>, spread: &Spread, unit: &Unit) -> Option<String> {
    let (_, factor) = subject
        .readers()
        .filter(|(_, factor)| factor.word == term)?;
    let Some(found) = spread.outstanding() else {
        let (lowest, highest, by) = spread.ends()?;
        return Some(format!(
            "{} differ by {}, from {lowest} (lowest) to {highest} (highest)",
            plural(term),
            unit.three_digits(by)
        ));
    };
    let others: Vec<String> = factor
        .levels
        .iter()
        .filter(|name| **name != found.name)
        .cloned()
        .collect();
    let others = if others.len() > NAMED_MAX {
        "the others".to_owned()
    } else {
        list(&others)
    };
    Some(format!(
        "{} reads {} {} than {others}, on {} of {} parts",
        found.name,
        unit.three_digits(found.offset.abs()),
        if found.offset > 0.0 {
            "higher"
        } else {
            "lower"
        },
        found.alike,
        found.compared
    ))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::tests::plant::{Drawn, Plant};

    /// Two parts (± 10), two loadings (± 1), two trials (± 1), nothing else: by the expected mean squares of the
    /// crossed model repeatability is 2, appraiser 8 / 4 = 2, the interaction below zero and so 0.
    #[test]
    fn rungs_of_a_study_by_hand() {
        let plant = Plant {
            parts: 2,
            readers: vec!["KL".into(), "MO".into()],
            trials: 2,
            drawn: vec![Drawn {
                lower: Some(-20.0),
                upper: Some(20.0),
                nominal: None,
                ..Drawn::named("by hand")
            }],
            ..Plant::halden()
        };
        let value = |levels: &[usize], slot: usize| {
            [-10.0, 10.0][levels[0]] + [-1.0, 1.0][levels[1]] + [-1.0, 1.0][slot]
        };
        let worked = plant.worked_with(&value);
        let record = worked.outcomes[0].study.as_ref().unwrap();
        let subject = Subject {
            record,
            feature: &worked.evidence.features[0],
            evidence: &worked.evidence,
            earlier: None,
        };
        let ladder = Ladder::of(subject).unwrap();
        let near = |rung: &Rung, variance: f64| {
            assert!((rung.sd - variance.sqrt()).abs() < 1e-12, "{rung:?}")
        };
        near(&ladder.now, 4.0);
        assert_eq!(ladder.steps.len(), 3);
        near(&ladder.steps[0], 2.0);
        near(&ladder.steps[1], 4.0);
        near(&ladder.steps[2], 3.0);
        assert_eq!(ladder.longest(), Some(&ladder.steps[0]));
        let advice = ladder
            .advice(subject, &Spread::of(subject))
            .unwrap()
            .replace('\u{a0}', " ");
        // 6 √2 / 40 = 21 %, 6 × 2 / 40 = 30 %.
        assert_eq!(
            advice,
            "The longest step down is without the loading differences, 21 % instead of 30 %: loadings differ by \
             2.00 mm, from KL (lowest) to MO (highest)."
        );
    }
}
