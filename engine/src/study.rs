//! From readings to a study.

use std::sync::OnceLock;

use crate::basis::Basis;
use crate::combination::Combination;
use crate::design::Design;
use crate::estimates::Estimates;
use crate::fault::StudyError;
use crate::figure::{Figure, Interval};
use crate::figures::{Evidence, ndc};
use crate::generalized::Simulation;
use crate::limits::Quantity;
use crate::model::Model;
use crate::pooling;
use crate::record::{
    ChanceAbove, Component, Figures, InteractionChoice, Layout, OtherReading, Remark, Study,
};
use crate::remarks::outside;
use crate::reml;
use crate::risk::of_study;
use crate::settings::{Interaction, Judge, Settings, Tolerance};
use crate::sums::{Sums, Sweep};
use crate::table::Table;
use crate::tolerance::Share;

/// Readings that a cell may hold.
pub const TRIALS_MAX: usize = 10_000;
/// Differences between readings that squares can hold.
const SPREAD: std::ops::RangeInclusive<f64> = 1e-140..=1e140;

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
    settings: Settings,
    simulation: Simulation,
    sweep: Sweep,
    kept: Basis,
    /// The term that the error holds for want of a second trial.
    taken_in: Option<String>,
    /// All interaction terms pooled; absent when there are none.
    pooled: Option<Pooled>,
}

#[derive(Debug)]
struct Pooled {
    model: Model,
    basis: OnceLock<Basis>,
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
        let kept = Basis::new(Model::estimable(design, trials), settings);
        let interactions = kept.model.interactions();
        let pooled = (!interactions.is_empty()).then(|| kept.model.without(design, &interactions));
        Ok(Prepared {
            design: design.clone(),
            trials,
            settings: *settings,
            simulation: Simulation::default(),
            sweep: Sweep::new(design, trials),
            taken_in: kept.model.taken_in_by_error(design),
            kept,
            pooled: pooled.map(|model| Pooled {
                model,
                basis: OnceLock::new(),
            }),
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
        let readings = self.by_cell(cells, values)?;
        let sums = self.sweep.sums(&readings);
        let share = Share::of(tolerance, &self.settings, sums.grand_mean);
        Ok(self.with_basis(&sums, |basis| self.record(basis, &sums, &share)))
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
        let readings = self.by_cell(cells, values)?;
        let sums = self.sweep.sums(&readings);
        let share = Share::of(&Tolerance::default(), &self.settings, sums.grand_mean);
        Ok(self.with_basis(&sums, |basis| {
            self.with_evidence(basis, &sums, &share, |evidence, _| {
                evidence.figure_by(quantity, by)
            })
        }))
    }

    /// The same with other draws than the usual ones, at least one.
    pub fn simulated(mut self, simulation: Simulation) -> Prepared {
        let simulation = Simulation {
            draws: simulation.draws.max(1),
            ..simulation
        };
        self.simulation = simulation;
        self.kept = self.kept.simulated(simulation);
        if let Some(pooled) = &mut self.pooled {
            pooled.basis = OnceLock::new();
        }
        self
    }

    fn with_basis<T>(&self, sums: &Sums, f: impl FnOnce(&Basis) -> T) -> T {
        let basis = |model| Basis::new(model, &self.settings).simulated(self.simulation);
        match (self.partly_pooled(sums), &self.pooled) {
            (None, _) => f(&self.kept),
            (Some(model), Some(pooled)) if pooled.model == model => {
                f(pooled.basis.get_or_init(|| basis(model)))
            }
            (Some(model), _) => f(&basis(model)),
        }
    }

    /// The model after pooling, largest interaction first; `None` when nothing is pooled.
    fn partly_pooled(&self, sums: &Sums) -> Option<Model> {
        let Interaction::PoolAbove(limit) = self.settings.interaction else {
            return None;
        };
        pooling::pooled_above(limit, &self.design, &self.kept.model, sums).1
    }

    fn with_evidence<T>(
        &self,
        basis: &Basis,
        sums: &Sums,
        share: &Share,
        f: impl FnOnce(&Evidence<'_>, &Table<'_>) -> T,
    ) -> T {
        let model = &basis.model;
        let table = Table::new(model, sums);
        let components: Vec<Combination> = (0..model.lines().len())
            .map(|i| model.component(i))
            .collect();
        let estimates = Estimates::new(model, &components, &table.ms);
        let evidence = Evidence {
            basis,
            ms: &table.ms,
            estimates: &estimates,
            share,
            confidence: self.settings.confidence,
            all_equal: sums.total() == 0.0,
            grand_mean: sums.grand_mean,
        };
        f(&evidence, &table)
    }

    fn record(&self, basis: &Basis, sums: &Sums, share: &Share) -> Study {
        self.with_evidence(basis, sums, share, |evidence, table| {
            self.study_of(evidence, table, sums, share)
        })
    }

    fn study_of(
        &self,
        evidence: &Evidence<'_>,
        table: &Table<'_>,
        sums: &Sums,
        share: &Share,
    ) -> Study {
        let components = evidence.components();
        let figures = evidence.figures();
        let part_to_gauge = evidence.part_to_gauge();
        let judged = &figures.gauge.share_of_tolerance;
        let process = self.settings.process;
        let risk = process.map(|process| of_study(evidence, process, sums.grand_mean));
        let drawn = [judged]
            .into_iter()
            .chain(risk.as_ref().map(|risk| &risk.producer.joint))
            .any(|figure| figure.interval == Some(Interval::Generalized));
        Study {
            tolerance_rule: share.rule,
            design: self.layout(),
            method: "anova",
            confidence: self.settings.confidence,
            spread_sds: self.settings.spread_sds,
            interaction: self.interaction(&evidence.basis.model, sums, share),
            mean_squares: table.lines(sums.total()),
            reml: None,
            ndc: ndc(&part_to_gauge),
            risk,
            chance_above: self.chance_above(evidence, judged.estimate.is_some()),
            remarks: self.remarks(sums, &components, &figures, &part_to_gauge),
            draws: drawn.then_some(self.simulation.draws),
            seed: drawn.then_some(self.simulation.seed),
            grand_mean: sums.grand_mean,
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
        let pooled = pooling::remark(
            self.settings.interaction,
            &self.design,
            &self.kept.model,
            sums,
        );
        one_trial
            .into_iter()
            .chain(pooled)
            .chain(outside::outside_limits(components, figures, part_to_gauge))
            .collect()
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

    fn interaction(&self, chosen: &Model, sums: &Sums, share: &Share) -> InteractionChoice {
        let full = &self.kept.model;
        let largest = full.interactions().first().copied();
        let nothing_pooled = chosen == full;
        let other = if nothing_pooled {
            self.pooled.as_ref().map(|p| &p.model)
        } else {
            Some(full)
        };
        InteractionChoice {
            kept: !chosen.interactions().is_empty(),
            p: largest
                .and_then(|line| Table::new(full, sums).test(line))
                .map(|t| t.p),
            pool_above: match self.settings.interaction {
                Interaction::Keep => None,
                Interaction::PoolAbove(p) => Some(p),
            },
            other_reading: other.map(|model| other_reading(model, sums, share)),
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

fn other_reading(model: &Model, sums: &Sums, share: &Share) -> OtherReading {
    let table = Table::new(model, sums);
    let components: Vec<Combination> = (0..model.lines().len())
        .map(|i| model.component(i))
        .collect();
    let gauge_sd = Estimates::new(model, &components, &table.ms)
        .gauge
        .map(f64::sqrt);
    let per_sd = share.per_sd.as_ref().ok().filter(|_| sums.total() > 0.0);
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
