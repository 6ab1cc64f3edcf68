//! One characteristic as a section of the page sees it: its record, its readings, and what was before.

use restudy_engine::{Component, Figure, Limits, PART};

use crate::evidence::{Evidence, Factor, Feature};
use crate::ledger::Earlier;
use crate::plain::in_error;
use crate::record::Record;

use super::unit::Unit;

/// A characteristic with a study.
#[derive(Clone, Copy)]
pub(super) struct Subject<'a> {
    pub(super) record: &'a Record,
    pub(super) feature: &'a Feature,
    pub(super) evidence: &'a Evidence,
    pub(super) earlier: Option<&'a Earlier>,
}

/// What kind of component adds to the gauge's spread.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Cause {
    /// Levels of a factor, or of several, that differ on all parts alike.
    Difference,
    /// Levels that differ from part to part.
    Interaction,
    /// Repeats of one cell.
    Repeats,
}

impl<'a> Subject<'a> {
    /// The gauge's sd, in reading units.
    pub(super) fn gauge_sd(self) -> Option<f64> {
        self.record.study.figures.gauge.sd.estimate
    }

    /// The gauge's share of tolerance.
    pub(super) fn share(self) -> &'a Figure {
        &self.record.study.figures.gauge.share_of_tolerance
    }

    /// The limits on the share.
    pub(super) fn limits(self) -> Option<Limits> {
        self.record.standing.limits
    }

    /// Share of tolerance of an sd of one reading unit; `None` when there is no share of tolerance.
    pub(super) fn share_per_sd(self) -> Option<f64> {
        let study = &self.record.study;
        let (share, sd) = (self.share().estimate?, self.gauge_sd()?);
        let per_sd = match self.width() {
            Some(width) => study.spread_sds / width,
            None => share / sd,
        };
        per_sd.is_finite().then_some(per_sd)
    }

    /// Width of a two-sided tolerance, in reading units.
    pub(super) fn width(self) -> Option<f64> {
        let width = self.record.upper? - self.record.lower?;
        (width > 0.0 && width.is_finite()).then_some(width)
    }

    /// The length that counts as the whole tolerance: its width, or the width that its rule gives it.
    pub(super) fn whole(self) -> Option<f64> {
        let by_rule = || Some(self.record.study.spread_sds / self.share_per_sd()?);
        self.width()
            .or_else(by_rule)
            .filter(|whole| *whole > 0.0 && whole.is_finite())
    }

    /// The unit for sds and deviations.
    pub(super) fn unit(self) -> Unit {
        let total = self.record.study.figures.total.sd.estimate;
        let size = total.filter(|sd| *sd > 0.0).or(self.width()).unwrap_or(1.0);
        Unit::for_size(self.record.unit.as_deref(), size)
    }

    /// Index of the factor whose levels are told apart in pictures: the appraiser, or else the first further factor.
    pub(super) fn readers(self) -> Option<(usize, &'a Factor)> {
        let others = || {
            self.evidence
                .factors
                .iter()
                .enumerate()
                .skip(1)
                .find(|(_, f)| f.levels.len() > 1)
        };
        self.evidence.appraiser().or_else(others)
    }

    /// The components that make up the gauge, in the order of the analysis.
    pub(super) fn causes(self) -> impl Iterator<Item = (Cause, &'a Component)> {
        self.record
            .study
            .components
            .iter()
            .filter_map(|component| Some((cause(component)?, component)))
    }

    /// The term that one trial does not tell from repeatability, in the plant's words.
    pub(super) fn undivided(self) -> Option<String> {
        let term = in_error(&self.record.study)?;
        Some(self.term(&term.of, &term.within))
    }

    /// A term in the plant's words: `loading`, `part × loading`.
    pub(super) fn term(self, of: &[String], within: &[String]) -> String {
        let word = |name: &String| {
            let factor = self.evidence.factors.iter().find(|f| f.name == *name);
            factor.map_or_else(|| name.clone(), |f| f.word.clone())
        };
        let words = |names: &[String]| names.iter().map(word).collect::<Vec<_>>().join(" × ");
        match (of, within) {
            ([], _) => self.undivided().map_or_else(
                || "repeatability".to_owned(),
                |term| format!("repeatability with {term}"),
            ),
            (of, []) => words(of),
            (of, within) => format!("{} within {}", words(of), words(within)),
        }
    }
}

fn cause(component: &Component) -> Option<Cause> {
    let holds_part = component.of.iter().any(|f| f == PART);
    match (&component.of[..], holds_part) {
        ([], _) => Some(Cause::Repeats),
        ([_], true) => None,
        (_, true) => Some(Cause::Interaction),
        (_, false) => Some(Cause::Difference),
    }
}
