//! From readings to a study.

use std::sync::{Arc, Mutex, PoisonError};

use crate::basis::Basis;
use crate::design::Design;
use crate::fault::StudyError;
use crate::figure::{Figure, Interval};
use crate::figures::{Evidence, ndc};
use crate::generalized::Simulation;
use crate::glance::Glance;
use crate::limits::Quantity;
use crate::model::Model;
use crate::pooling::{Pooled, pooled_above};
use crate::record::{
    ChanceAbove, Component, Figures, InteractionChoice, Layout, OtherReading, Remark, Study,
};
use crate::remarks::outside;
use crate::reml;
use crate::risk::of_study;
use crate::settings::{Interaction, Judge, Settings, Tolerance};
use crate::sums::{Sums, Sweep};
use crate::tolerance::Share;

/// Readings that a cell may hold.
pub const TRIALS_MAX: usize = 10_000;
/// Differences between readings that squares can hold.
pub(crate) const SPREAD: std::ops::RangeInclusive<f64> = 1e-140..=1e140;

/// Works out one study: `cells[i]` is the cell of `values[i]`, readings of one cell are its trials.
///
/// The order of rows changes nothing.
///
/// # Errors
/// [`StudyError`] when the readings do not fill the design evenly, are not finite, or settings are out of range.
pub fn analyse(
    design: &Design,
    cells: &[usize],
    values: &[f64],
    tolerance: &Tolerance,
    settings: &Settings,
) -> Result<Study, StudyError> {
    let counts = counts(design, cells, values)?;
    let trials = counts[0];
    if trials > 0 && counts.iter().all(|&count| count == trials) {
        return Prepared::new(design, trials, settings)?.study(cells, values, tolerance);
    }
    reml::study(design, counts, cells, values, tolerance, settings)
}

/// A design with everything that does not depend on the readings, shared by all its characteristics.
#[derive(Debug)]
pub struct Prepared {
    design: Design,
    trials: usize,
    pub(crate) settings: Settings,
    pub(crate) sweep: Sweep,
    kept: Arc<Basis>,
    /// The term that the error holds for want of a second trial.
    taken_in: Option<String>,
    /// Models without some of the interaction terms, as far as they were needed.
    others: Mutex<Vec<Arc<Basis>>>,
}

impl Prepared {
    /// Prepares a design with a number of trials for studies under some settings.
    ///
    /// # Errors
    /// [`StudyError`] for fewer than two parts, no trials, or settings out of range.
    pub fn new(
        design: &Design,
        trials: usize,
        settings: &Settings,
    ) -> Result<Prepared, StudyError> {
        check(design, trials, settings)?;
        let sweep = Sweep::new(design, trials);
        let model = Model::estimable(design, trials);
        let taken_in = model.taken_in_by_error(design);
        let kept = Basis::new(model, &sweep, settings, Simulation::default());
        Ok(Prepared {
            design: design.clone(),
            trials,
            settings: *settings,
            sweep,
            kept: Arc::new(kept),
            taken_in,
            others: Mutex::default(),
        })
    }

    /// Works out one characteristic; see [`analyse`].
    ///
    /// # Errors
    /// [`StudyError`] when the readings do not fill the design with the prepared number of trials.
    pub fn study(
        &self,
        cells: &[usize],
        values: &[f64],
        tolerance: &Tolerance,
    ) -> Result<Study, StudyError> {
        let mut glance = self.glance();
        glance.take(&self.by_cell(cells, values)?)?;
        let share = Share::of(tolerance, &self.settings, glance.sums.grand_mean);
        Ok(self.record(&glance, &share))
    }

    /// One figure of a characteristic with limits by a stated method instead of the one it is reported with; `None`
    /// where the design does not show the figure.
    ///
    /// # Errors
    /// [`StudyError`] when the readings do not fill the design with the prepared number of trials.
    pub fn figure(
        &self,
        cells: &[usize],
        values: &[f64],
        quantity: Quantity,
        by: Interval,
    ) -> Result<Option<Figure>, StudyError> {
        let mut glance = self.glance();
        glance.take(&self.by_cell(cells, values)?)?;
        let share = Share::of(&Tolerance::default(), &self.settings, 0.0);
        Ok(glance.evidence(&share).figure_by(quantity, by))
    }

    /// Numbers of one characteristic after another without their records, for many characteristics.
    pub fn glance(&self) -> Glance<'_> {
        Glance::new(self)
    }

    /// The same with other draws than the usual ones, at least one.
    pub fn simulated(self, simulation: Simulation) -> Prepared {
        let simulation = Simulation {
            draws: simulation.draws.max(1),
            ..simulation
        };
        let model = self.kept.model.clone();
        let kept = Basis::new(model, &self.sweep, &self.settings, simulation);
        Prepared {
            kept: Arc::new(kept),
            others: Mutex::default(),
            ..self
        }
    }

    pub(crate) fn kept(&self) -> Arc<Basis> {
        Arc::clone(&self.kept)
    }

    /// A model without some lines of another, worked out when first needed.
    fn without(&self, model: &Model, lines: &[usize]) -> Arc<Basis> {
        let model = model.without(&self.design, lines);
        let mut others = self.others.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(basis) = others.iter().find(|basis| basis.model == model) {
            return Arc::clone(basis);
        }
        let simulation = self.kept.simulation();
        let basis = Arc::new(Basis::new(model, &self.sweep, &self.settings, simulation));
        others.push(Arc::clone(&basis));
        basis
    }

    /// The model after pooling, largest interaction first; `None` when nothing is pooled.
    pub(crate) fn partly_pooled(&self, sums: &Sums) -> Option<Arc<Basis>> {
        let Interaction::PoolAbove(limit) = self.settings.interaction else {
            return None;
        };
        self.pooled_above(limit, sums).1
    }

    fn pooled_above(&self, limit: f64, sums: &Sums) -> (Vec<Pooled>, Option<Arc<Basis>>) {
        pooled_above(limit, &self.kept, sums, |model, line| {
            self.without(model, &[line])
        })
    }

    fn record(&self, glance: &Glance<'_>, share: &Share) -> Study {
        let evidence = glance.evidence(share);
        let components = evidence.components();
        let figures = evidence.figures();
        let part_to_gauge = evidence.part_to_gauge();
        let judged = &figures.gauge.share_of_tolerance;
        let grand_mean = glance.sums.grand_mean;
        let process = self.settings.process;
        let risk = process.map(|process| of_study(&evidence, process, grand_mean));
        let drawn = [judged]
            .into_iter()
            .chain(risk.as_ref().map(|risk| &risk.producer.joint))
            .any(|figure| figure.interval == Some(Interval::Generalized));
        let simulation = self.kept.simulation();
        Study {
            tolerance_rule: share.rule,
            design: self.layout(),
            method: "anova",
            confidence: self.settings.confidence,
            spread_sds: self.settings.spread_sds,
            interaction: self.interaction(glance, share),
            mean_squares: glance.table().lines(glance.sums.total()),
            reml: None,
            ndc: ndc(&part_to_gauge),
            risk,
            chance_above: self.chance_above(&evidence, judged.estimate.is_some()),
            remarks: self.remarks(&glance.sums, &components, &figures, &part_to_gauge),
            draws: drawn.then_some(simulation.draws),
            seed: drawn.then_some(simulation.seed),
            grand_mean,
            judged_share: match self.settings.judge {
                Judge::Estimate => judged.estimate,
                Judge::Chance(p) => judged.estimate.and_then(|_| evidence.judged_lower(p)),
                Judge::Upper => judged.upper,
            },
            components,
            figures,
            part_to_gauge,
        }
    }

    fn remarks(
        &self,
        sums: &Sums,
        components: &[Component],
        figures: &Figures,
        part_to_gauge: &Figure,
    ) -> Vec<Remark> {
        let one_trial = self.taken_in.as_deref().map(outside::one_trial);
        one_trial
            .into_iter()
            .chain(self.terms_pooled(sums))
            .chain(outside::outside_limits(components, figures, part_to_gauge))
            .collect()
    }

    /// Names the terms pooled, where there was more than one to pool.
    fn terms_pooled(&self, sums: &Sums) -> Option<Remark> {
        let Interaction::PoolAbove(limit) = self.settings.interaction else {
            return None;
        };
        if self.kept.model.interactions().len() < 2 {
            return None;
        }
        let (taken_in, left) = self.pooled_above(limit, sums);
        outside::terms_pooled(limit, &taken_in, &left?.model.interaction_names())
    }

    fn layout(&self) -> Layout {
        let cells = self.design.cells();
        Layout {
            factors: self.design.factors().to_vec(),
            trials: self.trials,
            cells,
            readings: cells * self.trials,
            missing: 0,
            balanced: true,
        }
    }

    fn interaction(&self, glance: &Glance<'_>, share: &Share) -> InteractionChoice {
        let full = &self.kept.model;
        let interactions = full.interactions();
        let chosen = &glance.basis.model;
        let other = if interactions.is_empty() {
            None
        } else if chosen == full {
            Some(self.without(full, &interactions))
        } else {
            Some(self.kept())
        };
        let under = |basis: Arc<Basis>| {
            let mut seen = self.glance();
            seen.sums = glance.sums.clone();
            seen.under(basis);
            seen
        };
        InteractionChoice {
            kept: !chosen.interactions().is_empty(),
            p: interactions
                .first()
                .and_then(|&largest| under(self.kept()).p(largest)),
            pool_above: match self.settings.interaction {
                Interaction::Keep => None,
                Interaction::PoolAbove(p) => Some(p),
            },
            other_reading: other.map(|basis| other_reading(&under(basis), share)),
        }
    }

    fn chance_above(&self, evidence: &Evidence<'_>, judged: bool) -> ChanceAbove {
        let Some(limits) = self.settings.limits.filter(|_| judged) else {
            return ChanceAbove::default();
        };
        let [watch, act] = evidence.chances_above([limits.watch, limits.act]);
        ChanceAbove { watch, act }
    }

    /// The readings cell by cell, ascending within each.
    fn by_cell(&self, cells: &[usize], values: &[f64]) -> Result<Vec<f64>, StudyError> {
        let counts = counts(&self.design, cells, values)?;
        if let Some((cell, &count)) = counts
            .iter()
            .enumerate()
            .find(|&(_, &count)| count != self.trials)
        {
            return Err(StudyError::Unbalanced {
                cell,
                place: self.design.cell_in_words(cell),
                count,
                expected: self.trials,
            });
        }
        let mut next: Vec<usize> = (0..counts.len()).map(|cell| cell * self.trials).collect();
        let mut readings = vec![0.0; values.len()];
        for (&cell, &value) in cells.iter().zip(values) {
            readings[next[cell]] = value;
            next[cell] += 1;
        }
        readings
            .chunks_exact_mut(self.trials)
            .for_each(|cell| cell.sort_by(f64::total_cmp));
        check_spread(&readings, readings[0])?;
        Ok(readings)
    }
}

fn other_reading(seen: &Glance<'_>, share: &Share) -> OtherReading {
    let gauge_sd = seen.estimates().gauge.map(f64::sqrt);
    let spread = seen.sums.total() > 0.0;
    let per_sd = share.per_sd.as_ref().ok().filter(|_| spread);
    OtherReading {
        gauge_sd,
        share_of_tolerance: gauge_sd.zip(per_sd).map(|(sd, per_sd)| sd * per_sd),
    }
}

pub(crate) fn counts(
    design: &Design,
    cells: &[usize],
    values: &[f64],
) -> Result<Vec<usize>, StudyError> {
    if cells.len() != values.len() {
        return Err(StudyError::Lengths {
            cells: cells.len(),
            values: values.len(),
        });
    }
    if values.is_empty() {
        return Err(StudyError::Empty);
    }
    let mut counts = vec![0; design.cells()];
    for (row, (&cell, &value)) in cells.iter().zip(values).enumerate() {
        let Some(count) = counts.get_mut(cell) else {
            return Err(StudyError::NoSuchCell {
                row,
                cell,
                last: design.cells() - 1,
            });
        };
        if !value.is_finite() {
            return Err(StudyError::NotFinite { row, value });
        }
        *count += 1;
    }
    Ok(counts)
}

/// What is asked of any study, whatever its readings.
pub(crate) fn check(design: &Design, trials: usize, settings: &Settings) -> Result<(), StudyError> {
    settings.check()?;
    let parts = design.factors()[design.part()].levels;
    if parts < 2 {
        return Err(StudyError::TooFewParts(parts));
    }
    if trials == 0 {
        return Err(StudyError::Empty);
    }
    if trials > TRIALS_MAX {
        return Err(StudyError::TooManyTrials(trials));
    }
    Ok(())
}

/// Checks that squares can hold the differences between the readings and one of them.
pub(crate) fn check_spread(values: &[f64], one: f64) -> Result<(), StudyError> {
    let spread = values.iter().map(|y| (y - one).abs()).fold(0.0, f64::max);
    if spread != 0.0 && !SPREAD.contains(&spread) {
        return Err(StudyError::Spread(spread));
    }
    Ok(())
}
