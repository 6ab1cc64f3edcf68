//! Readings reduced to what the likelihood needs: the mean of every cell and the sum of squares within cells.
//!
//! Means are twofold numbers taken from the first reading, so that an offset costs no digits; then everything is
//! divided by a power of two near the largest deviation, so that variances are of order one.
//!
//! Invariant: the order of rows changes nothing.

use crate::fault::StudyError;
use crate::study::check_spread;
use crate::twofold::Twofold;

use super::blocks::Blocks;

/// A root of a sum of squares below this part of the largest deviation is nothing but rounding.
const ROUNDING: f64 = 16.0 * f64::EPSILON * f64::EPSILON;

/// Cell means and the sum of squares within cells, scaled.
#[derive(Debug, Clone)]
pub(super) struct Reduced {
    /// Readings of every cell of the design.
    pub(super) counts: Vec<usize>,
    /// Mean of every cell less `centre`, divided by `scale`; zero for a cell without readings.
    means: Vec<Twofold>,
    /// Sum of squares within cells, divided by the square of `scale`.
    pub(super) within: f64,
    /// Mean of the cell means, in reading units.
    pub(super) centre: f64,
    /// A power of two, in reading units; 0 when all readings are equal.
    pub(super) scale: f64,
}

/// What the blocks of a model see of the readings.
#[derive(Debug, Clone)]
pub(super) struct Seen {
    /// Block after block: differences from the first cell, then the first cell.
    pub(super) values: Vec<f64>,
    /// Sum of squares within cells.
    pub(super) within: f64,
}

impl Reduced {
    /// `cells[i]` is the cell of `values[i]`; there is at least one reading.
    ///
    /// # Errors
    /// [`StudyError::Spread`] where squares cannot hold the readings' differences.
    pub(super) fn new(
        counts: Vec<usize>,
        cells: &[usize],
        values: &[f64],
    ) -> Result<Reduced, StudyError> {
        let mut rows: Vec<(usize, f64)> =
            cells.iter().copied().zip(values.iter().copied()).collect();
        rows.sort_by(|a, b| a.0.cmp(&b.0).then(a.1.total_cmp(&b.1)));
        let origin = rows[0].1;
        check_spread(values, origin)?;
        let largest = values
            .iter()
            .map(|y| (y - origin).abs())
            .fold(0.0, f64::max);
        let scale = if largest > 0.0 {
            2f64.powi(largest.log2().floor() as i32)
        } else {
            0.0
        };
        let unit = if scale > 0.0 { scale } else { 1.0 };
        let mut means = vec![Twofold::ZERO; counts.len()];
        let mut within = Twofold::ZERO;
        for of_cell in rows.chunk_by(|a, b| a.0 == b.0) {
            let (cell, first) = of_cell[0];
            let from_first = |y: f64| Twofold::difference(y, first).over(unit);
            let mean = of_cell
                .iter()
                .map(|&(_, y)| from_first(y))
                .fold(Twofold::ZERO, Twofold::plus)
                .over(of_cell.len() as f64);
            within = of_cell
                .iter()
                .map(|&(_, y)| from_first(y).minus(mean).squared())
                .fold(within, Twofold::plus);
            means[cell] = Twofold::difference(first, origin).over(unit).plus(mean);
        }
        let present = || (0..counts.len()).filter(|&cell| counts[cell] > 0);
        let centre = present()
            .map(|cell| means[cell])
            .fold(Twofold::ZERO, Twofold::plus)
            .over(present().count() as f64);
        present().for_each(|cell| means[cell] = means[cell].minus(centre));
        let floor = values.len() as f64 * (largest / unit).powi(2) * ROUNDING;
        let within = within.value();
        Ok(Reduced {
            counts,
            means,
            within: if within > floor { within } else { 0.0 },
            centre: centre.value() * unit + origin,
            scale,
        })
    }

    pub(super) fn all_equal(&self) -> bool {
        self.scale == 0.0
    }

    pub(super) fn seen_by(&self, blocks: &Blocks) -> Seen {
        let seen = blocks.blocks.iter().flat_map(|block| {
            let first = self.means[block.cells[0]];
            let others = block.cells[1..]
                .iter()
                .map(move |&cell| self.means[cell].minus(first));
            others.chain([first]).map(Twofold::value)
        });
        Seen {
            values: seen.collect(),
            within: self.within,
        }
    }

    /// The same cell means as single readings.
    pub(super) fn as_single_readings(&self) -> Reduced {
        Reduced {
            counts: self.counts.iter().map(|&n| n.min(1)).collect(),
            within: 0.0,
            ..self.clone()
        }
    }
}
