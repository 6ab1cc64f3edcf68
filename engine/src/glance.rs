//! The closed-form numbers of one characteristic after another, without their records.
//!
//! A glance holds the mean squares of the readings that it took last; every other number is worked out when it is asked
//! for. Its room is used again: once it has taken a characteristic, the next ones allocate nothing, except for figures
//! with simulated limits.

use std::sync::Arc;

use crate::basis::Basis;
use crate::estimates::Estimates;
use crate::fault::StudyError;
use crate::figure::Interval;
use crate::figures::Evidence;
use crate::limits::Quantity;
use crate::mls::Scale;
use crate::model::Line;
use crate::settings::Tolerance;
use crate::study::{Prepared, check_spread};
use crate::sums::{Room, Sums};
use crate::table::Table;
use crate::tolerance::Share;

/// Total sums of squares of readings whose differences squares can surely hold.
const SURELY_HELD: std::ops::Range<f64> = 1e-250..1e250;

/// A look at one characteristic; see [`Prepared::glance`].
#[derive(Debug)]
pub struct Glance<'a> {
    prepared: &'a Prepared,
    pub(crate) basis: Arc<Basis>,
    pub(crate) sums: Sums,
    room: Room,
    share: Share,
    ss: Vec<f64>,
    pub(crate) ms: Vec<f64>,
    scale: Scale,
    raw: Vec<f64>,
    estimates: Estimates,
    all_equal: bool,
}

impl<'a> Glance<'a> {
    pub(crate) fn new(prepared: &'a Prepared) -> Glance<'a> {
        Glance {
            prepared,
            basis: prepared.kept(),
            sums: Sums::default(),
            room: Room::default(),
            share: Share::of(&Tolerance::default(), &prepared.settings, 0.0),
            ss: Vec::new(),
            ms: Vec::new(),
            scale: Scale::of(&[]),
            raw: Vec::new(),
            estimates: Estimates::default(),
            all_equal: false,
        }
    }

    /// Takes the readings of one characteristic, in reading units: cell by cell in the order of the design, the trials
    /// of a cell side by side.
    ///
    /// Their order within a cell changes nothing but the last digit.
    ///
    /// # Errors
    /// [`StudyError`] when their number is not that of the prepared study or one is not finite. The glance then holds
    /// no characteristic: every number is absent until the next are taken.
    pub fn take(&mut self, readings: &[f64]) -> Result<(), StudyError> {
        self.ms.clear();
        let expected = self.prepared.sweep.readings();
        if readings.len() != expected {
            return Err(StudyError::Lengths {
                cells: expected,
                values: readings.len(),
            });
        }
        self.prepared
            .sweep
            .sums(readings, &mut self.room, &mut self.sums);
        let not_finite = !(self.sums.grand_mean.is_finite() && self.sums.within.is_finite());
        if not_finite && let Some(row) = readings.iter().position(|y| !y.is_finite()) {
            let value = readings[row];
            return Err(StudyError::NotFinite { row, value });
        }
        if !SURELY_HELD.contains(&self.sums.total()) {
            check_spread(readings, readings[0])?;
        }
        self.under(self.prepared.kept());
        if let Some(pooled) = self.prepared.partly_pooled(&self.sums) {
            self.under(pooled);
        }
        Ok(())
    }

    /// The same sums of squares under another model.
    pub(crate) fn under(&mut self, basis: Arc<Basis>) {
        basis.mean_squares(&self.sums, &mut self.ss, &mut self.ms);
        self.scale = Scale::of(&self.ms);
        self.all_equal = self.sums.total() == 0.0;
        self.raw.clear();
        let components = basis.components.iter();
        self.raw
            .extend(components.map(|component| component.sum.value(&self.ms)));
        self.estimates = Estimates::new(&basis.model, &self.raw);
        self.basis = basis;
    }

    /// The lines that mean squares, F tests and components belong to, the error last; pooled ones are missing.
    pub fn lines(&self) -> &[Line] {
        self.basis.model.lines()
    }

    /// Mean squares of the lines, in squared reading units; none before readings are taken.
    pub fn mean_squares(&self) -> &[f64] {
        &self.ms
    }

    /// Upper tail of the F of a line; `None` for the error and where the denominator is not above zero.
    pub fn p(&self, line: usize) -> Option<f64> {
        if line < self.ms.len() {
            self.table().test(line).map(|test| test.p)
        } else {
            None
        }
    }

    /// The variance component of a line as it is, below zero or not, in squared reading units.
    pub fn component(&self, line: usize) -> Option<f64> {
        let taken = !self.ms.is_empty();
        self.raw.get(line).copied().filter(|_| taken)
    }

    /// A figure as the study estimates it, from components cut at zero; `None` where the design does not show it.
    pub fn estimate(&self, quantity: Quantity) -> Option<f64> {
        let e = &self.estimates;
        match quantity {
            _ if self.ms.is_empty() => None,
            Quantity::Repeatability => e.repeatability,
            Quantity::Reproducibility => e.reproducibility,
            Quantity::Gauge => e.gauge,
            Quantity::Part => e.part,
            Quantity::Total => Some(e.total),
            Quantity::PartToGauge => Some(e.part? / e.gauge.filter(|gauge| *gauge > 0.0)?),
        }
    }

    /// Two-sided limits of a figure by a stated method, lower and upper, at zero or above; the upper one is infinite
    /// where the data set none. `None` where the design does not show the figure or the method sets it no limits.
    pub fn limits(&self, quantity: Quantity, by: Interval) -> Option<(f64, f64)> {
        if self.ms.is_empty() {
            return None;
        }
        self.evidence(&self.share).two_sided(quantity, by)
    }

    pub(crate) fn table(&self) -> Table<'_> {
        Table {
            basis: &self.basis,
            ss: &self.ss,
            ms: &self.ms,
        }
    }

    pub(crate) fn estimates(&self) -> &Estimates {
        &self.estimates
    }

    pub(crate) fn evidence<'b>(&'b self, share: &'b Share) -> Evidence<'b> {
        Evidence {
            basis: &self.basis,
            ms: &self.ms,
            scale: self.scale,
            raw: &self.raw,
            estimates: self.estimates,
            share,
            confidence: self.prepared.settings.confidence,
            all_equal: self.all_equal,
            grand_mean: self.sums.grand_mean,
        }
    }
}
