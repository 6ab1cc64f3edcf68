//! Remarks: plain sentences about a study's data, with the figures behind them.
//!
//! Model: the readings are held against what a sound study of the same gauge would show: equal spread in all cells
//! and for all levels, no drift, each reading under its own label. What departs by more than luck is named, cell by
//! cell; what the study was never fit to show (steps, parts, order of runs) is named too. Worst first.
//!
//! Not here: what the tables of the study say already, and any repair of the readings.
//!
//! Invariant: a study without any of these faults gets a remark that rests on chance with a probability of at most
//! [`FALSE_ALARMS`] in all, shared equally between the kinds.

mod cells;
mod exchange;
mod levels;
mod luck;
mod material;
pub(crate) mod outside;
mod repeats;
mod scope;
mod step;
mod time;
mod words;

use crate::design::Design;
use crate::record::{Remark, Study};
use crate::settings::Tolerance;

use material::Material;

/// Chance that a study of a sound gauge gets any remark that rests on chance.
pub const FALSE_ALARMS: f64 = 0.01;
/// Kinds of remark that rest on chance: exchanged labels, identical repeats, spread of a cell, mean of a cell,
/// spread of a level, offset of a level, drift.
const KINDS: f64 = 7.0;
/// Chance that one kind is raised without cause.
const LEVEL: f64 = FALSE_ALARMS / KINDS;
/// Remarks that one study gets at most.
pub const REMARKS_MAX: usize = 5;

/// What the caller knows about the readings beside cell and value.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Context<'a> {
    /// A name for each factor, in the order of the design. A factor without one goes by its own name and numbers.
    pub factors: Vec<Names<'a>>,
    /// When each reading was taken, in seconds from any origin; empty when unknown.
    pub taken: Vec<Option<f64>>,
    /// Which trial of its cell each reading is, from 0; empty when unknown.
    pub trials: Vec<usize>,
    /// Unit of the readings.
    pub unit: Option<&'a str>,
}

/// A factor as people call it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Names<'a> {
    /// The factor's own word, such as `loading`.
    pub word: &'a str,
    /// Its levels; of a nested factor those of each combination of its containers in turn, the last container fastest.
    pub levels: Vec<&'a str>,
}

/// All remarks of a study, those it holds already among them: worst first, at most [`REMARKS_MAX`].
///
/// `cells`, `values` and `tolerance` are those the study was worked out from. Lists of the context that do not
/// match them are passed over. The same readings give the same remarks in any order of rows, apart from readings
/// without trial and time.
pub fn remarks(
    design: &Design,
    cells: &[usize],
    values: &[f64],
    study: &Study,
    tolerance: &Tolerance,
    context: &Context<'_>,
) -> Vec<Remark> {
    let Some(material) = Material::new(design, cells, values, study, tolerance, context) else {
        return study.remarks.clone();
    };
    let mut all = Vec::new();
    if step::too_few_values(&material) {
        all.extend(step::remark(&material));
        all.extend(study.remarks.iter().cloned());
    } else {
        let exchanged = exchange::find(&material);
        let mut named: Vec<usize> = exchanged.iter().flat_map(|e| e.cells).collect();
        all.extend(exchanged.map(|e| e.remark));
        all.extend(repeats::remark(&material));
        for found in cells::spread(&material)
            .into_iter()
            .chain(cells::mean(&material))
        {
            if !found.cells.iter().any(|c| named.contains(c)) {
                named.extend(&found.cells);
                all.push(found.remark);
            }
        }
        all.extend(levels::spread(&material, &named));
        all.extend(levels::offset(&material));
        all.extend(time::back_to_back(&material));
        all.extend(time::drift(&material));
        all.extend(scope::near_zero(&material));
        all.extend(step::remark(&material));
        all.extend(study.remarks.iter().cloned());
        all.extend(scope::too_small(&material));
        all.extend(scope::narrow_parts(&material));
    }
    all.truncate(REMARKS_MAX);
    all
}
